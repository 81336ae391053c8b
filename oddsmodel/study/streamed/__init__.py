"""A study whose records do not fit into memory: gathered once, block by block, then read in passes."""

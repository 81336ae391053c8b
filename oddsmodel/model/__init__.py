"""A fit with its names, its design and the records it rests on."""

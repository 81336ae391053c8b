"""From a file of records to a coded frame, and who of it is analysed."""

"""Files of a study: results.json, tidy CSV tables, and how they are put into a folder. Accepts only what may leave."""

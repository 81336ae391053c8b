"""Invented studies: each folder holds a plan, its records and the script that made them."""

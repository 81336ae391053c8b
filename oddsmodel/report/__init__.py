"""The report as one HTML file, made from disclosed results only."""

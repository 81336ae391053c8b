"""What each section of the report shows, worked out before any template sees it: plain frozen values, no statistics."""

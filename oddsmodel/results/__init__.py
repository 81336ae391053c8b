"""Small frozen types that carry answers from the floors that compute to those that write."""

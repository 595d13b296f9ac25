"""What the tests of running and serving share."""

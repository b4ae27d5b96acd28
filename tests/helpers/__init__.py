"""What several areas of the tests share."""

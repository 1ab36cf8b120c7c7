"""What several test modules share."""

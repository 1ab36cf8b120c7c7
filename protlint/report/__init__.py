"""The faces: a review as one plain document, and every rendering of it."""

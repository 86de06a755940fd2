"""What a pilot could have noticed: the picture at his eye, the cues in it, and when they stand out."""

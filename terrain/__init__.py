"""What is under it: ground heights, recipes, elevation files. Imports nothing of ours."""

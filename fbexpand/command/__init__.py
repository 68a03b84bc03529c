"""The main job from the command line."""

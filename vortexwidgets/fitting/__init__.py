"""Which vortex it was."""

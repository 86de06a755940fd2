"""See DEVELOPERS.md, the house."""

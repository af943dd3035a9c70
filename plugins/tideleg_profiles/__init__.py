"""Profile sources: power made from a load, a frequency, a solar feed-in or a stated spectrum."""

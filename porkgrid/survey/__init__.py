"""The engine: legs, routes, measures, limits, tiles, store and ranking."""

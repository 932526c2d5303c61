"""Rules and beams to criteria, hazard distances and optical density. Pure: numpy and the standard library."""

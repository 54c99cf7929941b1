"""From the measured reflection of a built board to what the fab and the surroundings did, and to what to change."""

"""Factor once, solve many: sparse factors, counts of negative pivots, and vibration modes with a proof."""

"""Pure numerics of the structure, as arrays over joints and members. Knows no solver, file or name."""

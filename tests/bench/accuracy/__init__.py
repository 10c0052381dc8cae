"""How near the mode estimator comes to what the data allow, on simulated tap recordings."""

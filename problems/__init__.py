"""What is designed: the physics of swept plates and the problems stated with it."""

"""What the engineer states: data and geometry only, no stiffness and no fixed-end action of any kind."""

"""How the ball moves: rolling, slipping, flight, impact."""

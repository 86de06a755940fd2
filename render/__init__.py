"""From a scene to what people take away: flight, margin, sight, picture, output."""

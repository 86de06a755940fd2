"""What is flown: frozen scene types, units, reader, shipped scenes and airframes."""

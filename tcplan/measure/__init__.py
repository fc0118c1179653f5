"""From measurements to materials: sweeps read, laws fitted with what is known of them, devices and lots."""

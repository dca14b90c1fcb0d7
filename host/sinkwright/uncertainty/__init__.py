"""How sure a reading is, and what may be concluded from it: pure computation, no device, no file."""

"""Window, menus, start."""

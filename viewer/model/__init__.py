"""Frozen data without I/O: meshes, mode sets, designs, dossiers. Everything is SI (m, kg, s, N, rad)."""

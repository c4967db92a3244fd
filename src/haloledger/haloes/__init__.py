"""Whose halo is it, and how massive: one list of haloes without doubles, and joint draws of mass, redshift and centre.

build.halo_list    galaxies and groups -> Haloes
draws.draw_haloes  Haloes -> HaloDraws, one universe a draw
"""

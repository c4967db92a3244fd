"""Electrons per gas mass, and the units of a dispersion measure."""

HELIUM_MASS_SHARE = 0.25
PER_PROTON = 1 - HELIUM_MASS_SHARE / 2
"""Electrons per proton mass of fully ionised primordial gas, 1 - Y/2 = 7/8."""

CM3_PER_MSUN_KPC3 = 4.046285187e-8
"""Proton masses per cm3 in 1 Msun kpc-3; a test holds it against astropy's constants."""

PC_PER_KPC = 1000.0

"""Numbers that the formulas share, with where they come from."""

AU_KM = 149_597_870.7  # IAU 2012 resolution B2, exact
DAY_S = 86_400.0
J2000_JD = 2_451_545.0  # TDB
JULIAN_CENTURY_DAYS = 36_525.0
G0_KM_S2 = 9.806_65e-3  # standard gravity, exact (BIPM)
GM_SUN_KM3_S2 = 132_712_440_041.279_419  # DE440 (Park and others 2021; the kernel's own comment area)

# Obliquity of the J2000 ecliptic, IAU 1976: the axes that SPICE calls ECLIPJ2000 and in which
# small-body elements are published. (IAU 2006 has 84381.406 arcseconds.)
OBLIQUITY_J2000_ARCSEC = 84_381.448

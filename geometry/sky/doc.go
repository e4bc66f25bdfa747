// Package sky turns directions among the stars into directions over a site,
// and back: ICRS (right ascension and declination of the catalogues), of date
// (apparent place, true equator and equinox, topocentric) and horizon (X east,
// Y north, Z up, along the WGS 84 normal), with the Sun and refraction.
//
// What changes slowly is prepared once for a Night, in fixed bins of 12 hours
// of UTC: precession, nutation, the Earth's velocity and the Sun, each with
// its rate of change. The same site, bin and UT1 give the same bits whatever
// instant inside the bin was asked for, so that a replay is identical. After
// that a direction is one rotation by the sidereal angle and a small vector.
//
// The chain is Meeus's (Astronomical Algorithms, 2nd ed., through
// github.com/soniakeys/meeus): IAU 1976 precession (ch. 21), IAU 1980 nutation
// (ch. 22), the Ron-Vondrák expression of annual aberration (ch. 23), IAU 1982
// sidereal time (ch. 12) and the Sun of ch. 25. Added to it are the frame bias
// and the precession rates of IAU 2000 (IERS Conventions 2003, ch. 5), diurnal
// aberration, and light deflection by the Sun. Polar motion (at most 0.6
// arcsec) is not applied and counts as error.
//
// A UTC instant is a time.Time, which knows no leap seconds; the package takes
// TAI-UTC as 37 s throughout, as tables do that look ahead to 2035. A leap
// second more or less moves a direction by less than 0.0001 arcsec through
// this, but it moves UT1-UTC by a whole second (15 arcsec): a configured
// UT1-UTC must end where a leap second is announced.
//
// Every answer outside the span that a Night covers is NaN, and so is every
// answer to a vector that is not of unit length. Nothing here knows what time
// it is.
package sky

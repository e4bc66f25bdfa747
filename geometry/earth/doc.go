// Package earth places things on and above the WGS 84 ellipsoid: geodetic
// positions, Earth-centred Earth-fixed (ECEF) vectors, and the local frame of
// east, north and up at a site.
//
// Heights are above the ellipsoid. Longitude is positive east.
package earth

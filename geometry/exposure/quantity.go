package exposure

// Power is in watts.
type Power float64

// Irradiance is in watts a square metre; 1 mW/cm² is 10.
type Irradiance float64

// RadiantExposure is in joules a square metre; 1 mJ/cm² is 10.
type RadiantExposure float64

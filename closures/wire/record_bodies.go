package wire

import (
	"beamward/closures"
)

// The words of the record for what the core numbers.
var (
	frameWords    = []string{"none", "icrs", "of_date", "horizon", "table"}
	triWords      = []string{"not_said", "yes", "no"}
	shutterWords  = []string{"unknown", "open", "moving", "closed"}
	altitudeWords = []string{"none", "ellipsoid", "mean_sea_level", "pressure"}
	motionWords   = []string{"not_said", "tracking", "slewing", "parked", "fixed"}
	detectorWords = []string{"blind", "alarm", "clear"}
	heardWords    = []string{"link", "reception"}
	shapeWords    = []string{"none", "icrs", "horizon", "track", "whole_sky"}
	throughWords  = []string{"none", "closed", "open"}
)

func aimSeen(a *archive, b *closures.AimSeen) {
	text(a, "beam", &b.Beam)
	text(a, "telescope", &b.Telescope)
	instant(a, "said", &b.Said)
	pointed(a, "aim", &b.Aim, aim)
	text(a, "from", &b.From)
	text(a, "target", &b.Target)
	number(a, "field_rad", &b.Field)
	word(a, "exposing", &b.Exposing, triWords)
}

func aim(a *archive, b *closures.Aim) {
	word(a, "frame", &b.Frame, frameWords)
	vector(a, "direction", &b.Direction)
	instant(a, "reference", &b.Reference)
	number(a, "rate_ra_rad_s", &b.RateRA)
	number(a, "rate_dec_rad_s", &b.RateDec)
	number(a, "pm_ra_rad_yr", &b.PMRA)
	number(a, "pm_dec_rad_yr", &b.PMDec)
	flag(a, "refracted", &b.Refracted)
	number(a, "error_rad", &b.Error)
	word(a, "motion", &b.Motion, motionWords)
	many(a, "points", &b.Points, aimPoint)
}

func aimPoint(a *archive, b *closures.AimPoint) {
	object(a, b, func(a *archive, b *closures.AimPoint) {
		instant(a, "at", &b.At)
		vector(a, "direction", &b.Direction)
	})
}

func aircraftSeen(a *archive, b *closures.AircraftSeen) {
	text(a, "source", &b.Source)
	instant(a, "said", &b.Said)
	text(a, "aircraft", &b.Aircraft)
	flag(a, "located", &b.Located)
	number(a, "lat_rad", &b.Position.Lat)
	number(a, "lon_rad", &b.Position.Lon)
	number(a, "altitude_m", &b.Position.Height)
	word(a, "altitude_from", &b.AltitudeFrom, altitudeWords)
	number(a, "speed_mps", &b.Speed)
	number(a, "track_rad", &b.Track)
	number(a, "climb_mps", &b.Climb)
	number(a, "error_m", &b.Error)
	number(a, "vertical_error_m", &b.VerticalError)
	number(a, "velocity_error_mps", &b.VelocityError)
	number(a, "vertical_velocity_error_mps", &b.VerticalVelError)
	flag(a, "on_ground", &b.OnGround)
	flag(a, "drill", &b.Drill)
}

func sighted(a *archive, b *closures.Sighted) {
	text(a, "source", &b.Source)
	instant(a, "said", &b.Said)
	flag(a, "has_direction", &b.HasDirection)
	vector(a, "direction", &b.Direction)
	number(a, "spread_rad", &b.Spread)
	whole(a, "for_ns", &b.For)
	flag(a, "clear", &b.Clear)
}

func detectorSeen(a *archive, b *closures.DetectorSeen) {
	text(a, "source", &b.Source)
	instant(a, "said", &b.Said)
	word(a, "state", &b.State, detectorWords)
}

func interlockSeen(a *archive, b *closures.InterlockSeen) {
	text(a, "source", &b.Source)
	instant(a, "said", &b.Said)
	flag(a, "safe", &b.Safe)
}

func shutterSeen(a *archive, b *closures.ShutterSeen) {
	text(a, "beam", &b.Beam)
	instant(a, "said", &b.Said)
	word(a, "position", &b.Position, shutterWords)
}

func laserSeen(a *archive, b *closures.LaserSeen) {
	text(a, "beam", &b.Beam)
	instant(a, "said", &b.Said)
	flag(a, "emitting", &b.Emitting)
	number(a, "power_w", &b.PowerW)
}

func watchKept(a *archive, b *closures.WatchKept) {
	text(a, "post", &b.Post)
	instant(a, "said", &b.Said)
	many(a, "by", &b.By, line[string])
	instant(a, "until", &b.Until)
}

func weatherSeen(a *archive, b *closures.WeatherSeen) {
	text(a, "source", &b.Source)
	instant(a, "said", &b.Said)
	number(a, "pressure_hpa", &b.PressureHPa)
	number(a, "temperature_c", &b.Temperature)
}

func heard(a *archive, b *closures.Heard) {
	text(a, "source", &b.Source)
	instant(a, "said", &b.Said)
	word(a, "scope", &b.Scope, heardWords)
	number(a, "messages_per_min", &b.MessagesPerMinute)
	flag(a, "connected", &b.Connected)
}

func holdPlaced(a *archive, b *closures.HoldPlaced) {
	text(a, "id", &b.ID)
	text(a, "beam", &b.Beam)
	text(a, "reason", &b.Reason)
	text(a, "by", &b.By)
	instant(a, "placed", &b.Placed)
	instant(a, "from", &b.From)
	instant(a, "until", &b.Until)
	pointed(a, "region", &b.Region, region)
	flag(a, "authority", &b.Authority)
	text(a, "caller", &b.Caller)
	text(a, "call_back", &b.CallBack)
}

func region(a *archive, b *closures.Region) {
	text(a, "id", &b.ID)
	word(a, "shape", &b.Shape, shapeWords)
	vector(a, "direction", &b.Direction)
	number(a, "radius_rad", &b.Radius)
	number(a, "az_from_rad", &b.Box.AzFrom)
	number(a, "az_to_rad", &b.Box.AzTo)
	number(a, "el_from_rad", &b.Box.ElFrom)
	number(a, "el_to_rad", &b.Box.ElTo)
	flag(a, "observed", &b.Observed)
	many(a, "points", &b.Points, aimPoint)
	word(a, "throughout", &b.Throughout, throughWords)
	line := int64(b.Line)
	whole(a, "line", &line)
	b.Line = int(line)
}

func holdReleased(a *archive, b *closures.HoldReleased) {
	text(a, "id", &b.ID)
	text(a, "by", &b.By)
	text(a, "reference", &b.Reference)
}

func rearmed(a *archive, b *closures.Rearmed) {
	text(a, "beam", &b.Beam)
	text(a, "by", &b.By)
	text(a, "note", &b.Note)
}

func trackReleased(a *archive, b *closures.TrackReleased) {
	text(a, "aircraft", &b.Aircraft)
	text(a, "source", &b.Source)
	text(a, "by", &b.By)
	text(a, "spotter", &b.Spotter)
}

func listConfirmed(a *archive, b *closures.ListConfirmed) {
	text(a, "authority", &b.Authority)
	text(a, "id", &b.ID)
	digest(a, "digest", &b.Digest)
	text(a, "by", &b.By)
}

func listWithdrawn(a *archive, b *closures.ListWithdrawn) {
	text(a, "authority", &b.Authority)
	text(a, "id", &b.ID)
	text(a, "by", &b.By)
	text(a, "confirmed_by", &b.ConfirmedBy)
	text(a, "reference", &b.Reference)
}

func clockState(a *archive, b *closures.ClockState) {
	whole(a, "step_ns", &b.Step)
	flag(a, "suspended", &b.Suspended)
	flag(a, "synchronised", &b.Synchronised)
	whole(a, "max_error_ns", &b.MaxError)
}

func recordState(a *archive, b *closures.RecordState) {
	whole(a, "durable", &b.Durable)
	whole(a, "behind_ns", &b.Behind)
	flag(a, "half", &b.Half)
	flag(a, "full", &b.Full)
	flag(a, "failed", &b.Failed)
	flag(a, "damaged", &b.Damaged)
}

func veto(a *archive, b *closures.Veto) {
	text(a, "beam", &b.Beam)
	text(a, "detail", &b.Detail)
}

func fault(a *archive, b *closures.Fault) {
	text(a, "beam", &b.Beam)
	text(a, "detail", &b.Detail)
}

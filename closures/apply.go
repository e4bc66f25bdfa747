package closures

import (
	"cmp"
	"slices"
	"time"

	"beamward/geometry"
	"beamward/geometry/sky"
)

// apply takes in one fact. A fact that cannot be taken changes nothing and
// says why; none of them opens anything by being refused.
func (s *State) apply(f Fact) *Error {
	switch b := f.Body.(type) {
	case Tick:
	case RulesSet:
		return s.applyRules(b)
	case ListOffered:
		return s.applyOffer(b)
	case ListConfirmed:
		return s.applyConfirm(b)
	case ListWithdrawn:
		return s.applyWithdraw(b)
	case NightReady:
		s.applyNight(b, f.At)
	case AimSeen:
		return s.applyAim(b, f.At)
	case InterlockSeen:
		return s.applyInterlock(b, f.At)
	case Heard:
		return s.applyHeard(b, f.At)
	case WeatherSeen:
		return s.applyWeather(b, f.At)
	case ShutterSeen:
		return s.applyShutter(b, f.At)
	case LaserSeen:
		return s.applyLaser(b, f.At)
	case HoldPlaced:
		return s.applyHold(b)
	case HoldReleased:
		return s.applyRelease(b)
	case Rearmed:
		return s.applyRearm(b)
	case AircraftSeen:
		return s.applyAircraft(b, f.At)
	case TrackReleased:
		return s.applyTrackReleased(b, f.At)
	case Sighted:
		return s.applySighting(b, f.At)
	case DetectorSeen:
		return s.applyDetector(b, f.At)
	case WatchKept:
		return s.applyWatch(b, f.At)
	case ClockState:
		s.scene.clock.ClockState, s.scene.clock.heard = b, f.At
		if b.Suspended || !(b.Step.Abs() <= s.rules.Clock.StepLimit) {
			s.scene.clock.stepped = true
		}
	case RecordState:
		s.scene.record = recordKnown{RecordState: b, heard: f.At}
	case Started:
		s.scene.started = true
	case Veto:
		s.eachBeam(b.Beam, func(o *beam) { o.fault = cmp.Or(b.Detail, "the second opinion disagrees") })
	case Fault:
		if b.Beam == EveryBeam || s.beam(b.Beam) == nil {
			s.scene.fault = cmp.Or(b.Detail, "the service found a fault in itself")
		} else {
			s.beam(b.Beam).fault = cmp.Or(b.Detail, "the service found a fault in itself")
		}
	default:
		s.scene.fault = "a fact of no known kind came"
		return Errorf(Internal, "", "fact %d: no such kind", f.Seq)
	}
	return nil
}

// eachBeam does something to one beam or to all.
func (s *State) eachBeam(id BeamID, do func(*beam)) (found bool) {
	for i := range s.beams {
		if id == EveryBeam || s.beams[i].rules.ID == id {
			do(&s.beams[i])
			found = true
		}
	}
	return found
}

func (s *State) applyRules(b RulesSet) *Error {
	if b.Rules == nil {
		return Errorf(Invalid, "give rules", "rules: none were given")
	}
	if err := b.Rules.Validate(); err != nil {
		return Errorf(Invalid, "mend the config", "rules: %v", err)
	}
	s.setRules(b.Rules)
	s.foresee()
	s.durable++
	return nil
}

func (s *State) applyOffer(b ListOffered) *Error {
	if b.List == nil {
		return Errorf(Invalid, "send the list again", "list: none was read")
	}
	same, tightens, err := s.book.Offer(s.rules, b.List)
	if err != nil {
		return asError(err)
	}
	if same {
		return nil
	}
	a := s.rules.Authority(b.List.Authority())
	e := Entry{List: b.List, By: b.By, Status: ListWaiting}
	if tightens || a.Loosening == LooseningAtOnce {
		e.Status = ListInForce
	}
	s.putList(e)
	return nil
}

// putList changes the book: a list that comes into force puts those that it
// replaces out of it.
func (s *State) putList(e Entry) {
	s.book = s.book.with(e)
	if e.Status == ListInForce {
		for _, id := range e.List.Text().Replaces {
			if old := s.book.Find(e.List.Authority(), id); old != nil && old.Status != ListGone {
				gone := *old
				gone.Status = ListReplaced
				s.book = s.book.with(gone)
			}
		}
	}
	s.durable++
	s.foresee()
}

func (s *State) applyConfirm(b ListConfirmed) *Error {
	e := s.book.Find(b.Authority, b.ID)
	if e == nil {
		return Errorf(NotFound, "see which lists there are", "list %s/%s: not known", b.Authority, b.ID)
	}
	a := s.rules.Authority(b.Authority)
	if a == nil {
		return Errorf(Conflict, "put the authority back into the config", "list %s/%s: its authority is not configured", b.Authority, b.ID)
	}
	if b.Digest != e.List.Digest() {
		return Errorf(Changed, "look at the list again and confirm what is there now", "list %s/%s: it is not the one that was looked at", b.Authority, b.ID)
	}
	next := *e
	switch {
	case e.Asked != "" && e.Status != ListGone:
		if a.Loosening == LooseningSecondPerson && (b.By == "" || b.By == e.Asked) {
			return Errorf(Conflict, "let a second person confirm", "list %s/%s: who asked to withdraw it cannot confirm it", b.Authority, b.ID)
		}
		next.Status, next.Confirmed = ListGone, b.By
	case e.Status == ListWaiting:
		if a.Loosening == LooseningSecondPerson && (b.By == "" || b.By == e.By) {
			return Errorf(Conflict, "let a second person confirm", "list %s/%s: who brought it cannot confirm it", b.Authority, b.ID)
		}
		next.Status, next.Confirmed = ListInForce, b.By
	default:
		return Errorf(Conflict, "nothing needs to be done", "list %s/%s: it does not wait for confirmation", b.Authority, b.ID)
	}
	s.putList(next)
	return nil
}

func (s *State) applyWithdraw(b ListWithdrawn) *Error {
	e := s.book.Find(b.Authority, b.ID)
	if e == nil || e.Status == ListGone {
		return Errorf(NotFound, "see which lists there are", "list %s/%s: not known", b.Authority, b.ID)
	}
	a := s.rules.Authority(b.Authority)
	next := *e
	next.Asked = b.By
	switch {
	case e.Status == ListWaiting && len(e.List.Text().Replaces) == 0 && a != nil && a.Loosening == LooseningAtOnce,
		a != nil && a.Loosening == LooseningAtOnce,
		b.ConfirmedBy != "" && (a == nil || a.Loosening == LooseningSecondPerson) && b.ConfirmedBy != b.By,
		b.ConfirmedBy != "" && a != nil && a.Loosening == LooseningConfirm:
		next.Status, next.Confirmed = ListGone, b.ConfirmedBy
	}
	s.putList(next)
	return nil
}

func (s *State) applyNight(b NightReady, at time.Time) {
	if b.Night == nil {
		return
	}
	bin := BinOf(b.Night)
	s.nights = slices.DeleteFunc(slices.Clone(s.nights), func(n *sky.Night) bool {
		return BinOf(n) == bin || BinOf(n).Until.Add(24*time.Hour).Before(at)
	})
	s.nights = append(s.nights, b.Night)
	slices.SortFunc(s.nights, func(a, o *sky.Night) int { return BinOf(a).From.Compare(BinOf(o).From) })
	if n := len(s.nights); n > keepNights {
		s.nights = s.nights[n-keepNights:]
	}
}

func (s *State) applyAim(a AimSeen, at time.Time) *Error {
	if n := s.rules.Neighbour(a.Telescope); n != nil {
		a.Aim = s.fromTheirs(n, a.Aim)
	}
	p, ok := prepared(a.Aim, s.night(a.Said), s.scene.Air)
	if a.Telescope != "" {
		return s.applyPointing(a, p, ok, at)
	}
	b := s.beam(a.Beam)
	if b == nil {
		return Errorf(NotFound, "name a configured beam", "aim: beam %.64q is not configured", a.Beam)
	}
	i, found := slices.BinarySearchFunc(b.aims, a.From, func(k aimKnown, from string) int { return cmp.Compare(k.seen.From, from) })
	if found && a.Said.Before(b.aims[i].seen.Said) {
		return nil // an older word than the newest from the same sender
	}
	if !ok {
		if found {
			b.aims = slices.Delete(b.aims, i, i+1)
		}
		b.moved = "an aim came that cannot be used"
		return Errorf(Invalid, "send a whole aim, when the night is prepared", "aim: beam %s: it cannot be used", a.Beam)
	}
	next := aimKnown{seen: a, aim: p, heard: at, began: at}
	if was := b.present(); was != nil {
		b.noticeMove(was, &next, s, at)
		if apart(was.aim, p, b.rules.Aim.UnannouncedMove, s.night(at), at) <= 0 {
			next.began = was.began
		}
	}
	if found {
		b.aims[i] = next
	} else {
		if len(b.aims) >= 8 {
			b.moved = "too many senders state the beam's aim"
			return Errorf(Invalid, "let at most eight senders state one beam's aim", "aim: beam %s: too many senders", a.Beam)
		}
		b.aims = slices.Insert(b.aims, i, next)
	}
	return nil
}

// noticeMove marks an aim that moved, while the beam was open, further than
// may go unannounced.
func (b *beam) noticeMove(was, next *aimKnown, s *State, at time.Time) {
	shut := b.shutter.Position == ShutterClosed && !b.shutterHeard.IsZero() && age(at, b.shutter.Said, b.shutterHeard) <= b.rules.FeedbackStale
	if !b.open || shut {
		return
	}
	beyond := apart(was.aim, next.aim, b.rules.Aim.UnannouncedMove, s.night(at), at)
	if !(beyond <= 0) {
		b.moved = "the aim moved further than may go unannounced"
	}
}

func (s *State) applyPointing(a AimSeen, p *Aim, ok bool, at time.Time) *Error {
	if s.rules.Neighbour(a.Telescope) == nil {
		return Errorf(NotFound, "name a configured neighbour", "aim: telescope %.64q is not configured", a.Telescope)
	}
	i, found := slices.BinarySearchFunc(s.scene.pointings, a.Telescope, func(o Pointing, id TelescopeID) int { return cmp.Compare(o.Telescope, id) })
	if found && a.Said.Before(s.scene.pointings[i].Seen.Said) {
		return nil
	}
	if !ok {
		p = nil // heard, but where it points is unknown
	}
	next := Pointing{Telescope: a.Telescope, Aim: p, Seen: a, Heard: at, AimBegan: at}
	pointings := slices.Clone(s.scene.pointings)
	if found {
		if was := pointings[i]; was.Aim != nil && p != nil && apart(was.Aim, p, 0, s.night(at), at) <= 0 {
			next.AimBegan = was.AimBegan
		}
		pointings[i] = next
	} else {
		pointings = slices.Insert(pointings, i, next)
	}
	s.scene.pointings = pointings
	s.refreshPointings()
	if !ok {
		return Errorf(Invalid, "send a whole aim", "aim: telescope %s: it cannot be used", a.Telescope)
	}
	return nil
}

// refreshPointings renews what is foreseeable without making the beams' region
// hits anew, which pointings do not touch.
func (s *State) refreshPointings() {
	next := *s.scene.Foreseen
	next.Pointings = slices.Clone(s.scene.pointings)
	s.scene.Foreseen = &next
}

func (s *State) applyInterlock(b InterlockSeen, at time.Time) *Error {
	src := s.scene.source(b.Source)
	if src == nil || src.rules.Kind != InterlockSource {
		return noSource(b.Source, "interlock")
	}
	if b.Said.Before(src.interlock.Said) {
		return nil
	}
	src.interlock = b
	src.hear(b.Said, at)
	return nil
}

func (s *State) applyHeard(b Heard, at time.Time) *Error {
	src := s.scene.source(b.Source)
	if src == nil {
		return noSource(b.Source, "")
	}
	src.hear(b.Said, at)
	if b.Connected {
		src.since = at
	}
	if b.Scope == HeardReception && geometry.Finite(b.MessagesPerMinute) {
		src.rate, src.rateSaid = b.MessagesPerMinute, b.Said
	}
	return nil
}

func (s *State) applyWeather(b WeatherSeen, at time.Time) *Error {
	src := s.scene.source(b.Source)
	if src == nil || src.rules.Kind != WeatherSource {
		return noSource(b.Source, "weather")
	}
	if b.Said.Before(s.scene.weather.Said) {
		return nil
	}
	src.hear(b.Said, at)
	s.scene.weather = b
	s.foresee()
	return nil
}

func noSource(id Source, kind string) *Error {
	if kind == "" {
		return Errorf(NotFound, "name a configured source", "source %.64q: not configured", id)
	}
	return Errorf(NotFound, "name a configured source of kind "+kind, "source %.64q: not configured as %s", id, kind)
}

func byHoldID(a, b HoldPlaced) int { return cmp.Compare(a.ID, b.ID) }

func (s *State) applyHold(b HoldPlaced) *Error {
	if !ValidName(string(b.ID)) {
		return Errorf(Invalid, "use 1 to 64 of A-Z a-z 0-9 . _ -", "hold: its id is not a name")
	}
	if b.Beam != EveryBeam && s.beam(b.Beam) == nil {
		return Errorf(NotFound, "name a configured beam, or *", "hold: beam %.64q is not configured", b.Beam)
	}
	if !b.Until.IsZero() && !b.Span().From.Before(b.Until) {
		return Errorf(Invalid, "until must be after from", "hold %s: it would hold at no time", b.ID)
	}
	if b.Region != nil {
		if cause, mend := b.Region.problem(); cause != "" {
			return Errorf(Invalid, mend, "hold %s: %s", b.ID, cause)
		}
	}
	i, found := slices.BinarySearchFunc(s.holds, b, byHoldID)
	if found {
		return Errorf(Conflict, "choose another id", "hold %s: there is one of this id", b.ID)
	}
	s.holds = slices.Insert(s.holds, i, b)
	s.durable++
	s.foresee()
	return nil
}

// CheckRelease says why a hold cannot be released so; nil when it can.
func CheckRelease(holds []HoldPlaced, b HoldReleased) *Error {
	i := slices.IndexFunc(holds, func(h HoldPlaced) bool { return h.ID == b.ID })
	if i < 0 {
		return Errorf(NotFound, "see which holds there are", "hold %.64q: not known", b.ID)
	}
	if holds[i].Authority {
		if b.By == "" || b.By == holds[i].By {
			return Errorf(Conflict, "let a second person release it", "hold %s: an authority's order is not released by who took it", b.ID)
		}
		if b.Reference == "" {
			return Errorf(Invalid, "give the authority's reference", "hold %s: an authority's order is released with a reference", b.ID)
		}
	}
	return nil
}

func (s *State) applyRelease(b HoldReleased) *Error {
	if err := CheckRelease(s.holds, b); err != nil {
		return err
	}
	s.holds = slices.DeleteFunc(slices.Clone(s.holds), func(h HoldPlaced) bool { return h.ID == b.ID })
	s.durable++
	s.foresee()
	return nil
}

func (s *State) applyRearm(b Rearmed) *Error {
	if b.By == "" {
		return Errorf(Invalid, "say who re-arms", "re-arm: no name was given")
	}
	for i := range s.beams {
		o := &s.beams[i]
		if (b.Beam == EveryBeam || b.Beam == o.rules.ID) && o.longestShutter > o.rules.ShutterTime {
			return Errorf(Conflict, "mend the shutter, or raise shutter_time to what was measured", "re-arm: beam %s: its shutter was slower than its shutter_time", o.rules.ID)
		}
	}
	if !s.eachBeam(b.Beam, func(o *beam) { o.latch.need = 0 }) {
		return Errorf(NotFound, "name a configured beam, or *", "re-arm: beam %.64q is not configured", b.Beam)
	}
	s.durable++
	return nil
}

func asError(err error) *Error {
	if e, ok := err.(*Error); ok {
		return e
	}
	return Errorf(Internal, "", "%v", err)
}

package alerts

import (
	"slices"
	"time"
)

// Kind names an alarm or a notice.
type Kind string

// Priority says how soon and how loudly an alarm asks for a person.
type Priority uint8

// The priorities. Notices have none.
const (
	NoPriority Priority = iota
	Low
	Medium
	High
)

var priorities = [...]string{"none", "low", "medium", "high"}

// String returns the priority's word.
func (p Priority) String() string {
	if int(p) < len(priorities) {
		return priorities[p]
	}
	return "none"
}

// ParsePriority reads what String writes.
func ParsePriority(s string) (Priority, bool) {
	i := slices.Index(priorities[:], s)
	return Priority(max(i, 0)), i >= 0
}

// Scope says what an alarm is about: its subject is the site ("") or the name
// of a beam, source and so on.
type Scope uint8

// The scopes.
const (
	OfSite Scope = iota
	OfBeam
	OfSource
	OfAuthority
	OfTelescope
	OfPost
	OfReceiver
)

var scopes = [...]string{"site", "beam", "source", "authority", "telescope", "post", "receiver"}

// String returns the scope's word.
func (s Scope) String() string {
	if int(s) < len(scopes) {
		return scopes[s]
	}
	return "site"
}

// Row is one line of the alarm table.
type Row struct {
	Kind     Kind
	Scope    Scope
	Priority Priority
	Safety   bool          // can be neither shelved nor taken out of service
	Always   bool          // asks for a person also while nobody works with a beam
	Seen     bool          // comes from the published decisions: stays as it was while there are none
	On, Off  time.Duration // its cause must last, or be gone, for so long
	Parents  []Kind        // while one of them is there this one is suppressed
	Respond  time.Duration // within which a person must act

	Cause, Consequence, Do string
}

// leastOff is the least Off of any alarm: with each further raise within half
// an hour doubling it, no alarm is raised three times in a minute.
const leastOff = 30 * time.Second

// The kinds of alarms.
const (
	ShutterFault        Kind = "shutter-fault"
	Fault               Kind = "fault"
	DecisionsStopped    Kind = "decisions-stopped"
	Clock               Kind = "clock"
	RecordDamaged       Kind = "record-damaged"
	Record              Kind = "record"
	Interlock           Kind = "interlock"
	DetectorAlarm       Kind = "detector-alarm"
	SourcesSilent       Kind = "sources-silent"
	AircraftLost        Kind = "aircraft-lost"
	AircraftUnlocated   Kind = "aircraft-unlocated"
	SourceSilent        Kind = "source-silent"
	ReceptionLost       Kind = "reception-lost"
	AimsDisagree        Kind = "aims-disagree"
	AimUnknown          Kind = "aim-unknown"
	ReaderSilent        Kind = "reader-silent"
	WatchMissing        Kind = "watch-missing"
	ListMissing         Kind = "list-missing"
	ListRefused         Kind = "list-refused"
	ReceiverUnreachable Kind = "receiver-unreachable"
	DiskLow             Kind = "disk-low"
	RearmWaiting        Kind = "rearm-waiting"
	NeighbourSilent     Kind = "neighbour-silent"
	ShutterSilent       Kind = "shutter-silent"
	ListWaiting         Kind = "list-waiting"
	SubmissionDue       Kind = "submission-due"
	FactsRefused        Kind = "facts-refused"
	Popups              Kind = "popups"
	NotReady            Kind = "not-ready"
)

// Rows is the alarm table, the first to be told first.
func Rows() []Row { return slices.Clone(rows[:]) }

// RowOf returns the row of an alarm; ok is false for what is none.
func RowOf(k Kind) (Row, bool) {
	if i := rank(k); i < len(rows) {
		return rows[i], true
	}
	return Row{}, false
}

// rank is the place of a kind in the table; past its end for what is none.
func rank(k Kind) int {
	for i := range rows {
		if rows[i].Kind == k {
			return i
		}
	}
	return len(rows)
}

var rows = [...]Row{
	{Kind: ShutterFault, Scope: OfBeam, Priority: High, Safety: true, Always: true, Seen: true, Off: leastOff, Respond: 30 * time.Second,
		Cause:       "The shutter was not closed in time, is silent where it must speak, or contradicts the laser.",
		Consequence: "Light may be on the sky without a permit.",
		Do:          "Press the emergency stop. Look at the shutter and the laser. Re-arm when they are mended."},
	{Kind: Fault, Scope: OfSite, Priority: High, Safety: true, Always: true, Seen: true, Off: leastOff, Respond: 2 * time.Minute,
		Cause:       "The service found a fault in itself, or the second opinion disagrees with a decision.",
		Consequence: "The beams named are shuttered; their last decisions are in doubt.",
		Do:          "Confirm that the light is off. Read the record's last entries, report the fault, re-arm only after an explanation."},
	{Kind: DecisionsStopped, Scope: OfSite, Priority: High, Safety: true, Always: true, On: time.Second, Off: leastOff, Respond: 2 * time.Minute,
		Cause:       "No fresh decision has been published for three decision intervals.",
		Consequence: "Every reader is told to shutter; nothing else that is shown is fresh.",
		Do:          "Confirm that the light is off. Look at the load of the machine and at the service's log; restart it."},
	{Kind: Clock, Scope: OfSite, Priority: High, Safety: true, Always: true, Seen: true, On: 5 * time.Second, Off: leastOff, Respond: 5 * time.Minute,
		Cause:       "The clock stepped, the machine slept, or the kernel does not vouch for its clock.",
		Consequence: "Every beam is shuttered, since every closure is a time.",
		Do:          "Look at the time service and its sources. Re-arm when the kernel vouches again."},
	{Kind: RecordDamaged, Scope: OfSite, Priority: High, Safety: true, Always: true, On: 2 * time.Second, Off: leastOff, Respond: 15 * time.Minute,
		Cause:       "The record's chain does not verify.",
		Consequence: "Every beam is shuttered; part of the record is no evidence any more.",
		Do:          "Keep the data directory as it is. Verify the record, restore the backup beside it, and report what is missing."},
	{Kind: Record, Scope: OfSite, Priority: High, Safety: true, Always: true, Seen: true, On: 2 * time.Second, Off: leastOff, Parents: []Kind{RecordDamaged}, Respond: 5 * time.Minute,
		Cause:       "The record cannot be written, is behind, or its queue is over half full.",
		Consequence: "Every beam is shuttered, since what is decided could not be answered for.",
		Do:          "Look at the disk: space, errors, load. Re-arm when the record keeps up."},
	{Kind: Interlock, Scope: OfSource, Priority: High, Safety: true, Seen: true, Off: leastOff, Respond: 2 * time.Minute,
		Cause:       "An interlock said unsafe while a beam was on the sky, or waits to be re-armed after it did.",
		Consequence: "The beams are shuttered; somebody may be where light can reach.",
		Do:          "Find who opened it. Re-arm when the place is clear and closed."},
	{Kind: DetectorAlarm, Scope: OfSource, Priority: High, Safety: true, Seen: true, Off: 60 * time.Second, Respond: 2 * time.Minute,
		Cause:       "A detector saw an aircraft near the beam, or waits to be re-armed after it did.",
		Consequence: "The beams are shuttered; the other sources may have missed it.",
		Do:          "Look at the sky and at the aircraft shown. Note what it was. Re-arm when the sky is clear."},
	{Kind: SourcesSilent, Scope: OfSite, Priority: High, Seen: true, On: 5 * time.Second, Off: leastOff, Respond: 5 * time.Minute,
		Cause:       "Three or more sources are silent at once.",
		Consequence: "Beams are shuttered; the network or a host that they share has most likely failed.",
		Do:          "Look at the network and at the host that the silent sources share."},
	{Kind: AircraftLost, Scope: OfSite, Priority: Medium, Safety: true, Seen: true, On: 60 * time.Second, Off: leastOff, Respond: 10 * time.Minute,
		Cause:       "An aircraft was lost where it can be in a keep-out.",
		Consequence: "The beam stays shuttered until the aircraft is seen again or a person releases it.",
		Do:          "Ask the spotters. Release the track on a spotter's word that it is gone."},
	{Kind: AircraftUnlocated, Scope: OfSite, Priority: Medium, Safety: true, Seen: true, On: 10 * time.Second, Off: 2 * time.Minute, Respond: 5 * time.Minute,
		Cause:       "A transponder is heard that gives no position.",
		Consequence: "No check can keep the beam out of it.",
		Do:          "Warn the spotters. Hold the beam when it may be near."},
	{Kind: SourceSilent, Scope: OfSource, Priority: Medium, Seen: true, On: 15 * time.Second, Off: 60 * time.Second, Parents: []Kind{SourcesSilent}, Respond: 10 * time.Minute,
		Cause:       "A required source has not been heard for its stale_after.",
		Consequence: "The beams are shuttered.",
		Do:          "Look at the source, its power and its connection."},
	{Kind: ReceptionLost, Scope: OfSource, Priority: Medium, Seen: true, On: 60 * time.Second, Off: 2 * time.Minute, Parents: []Kind{SourcesSilent, SourceSilent}, Respond: 10 * time.Minute,
		Cause:       "An aircraft source lives but does not prove that it receives.",
		Consequence: "The beams are shuttered: a deaf antenna looks like an empty sky.",
		Do:          "Look at the antenna and its cable. Compare with another receiver."},
	{Kind: AimsDisagree, Scope: OfBeam, Priority: Medium, Seen: true, On: 5 * time.Second, Off: 60 * time.Second, Respond: 5 * time.Minute,
		Cause:       "Two senders state aims that disagree, or the aim moved unannounced.",
		Consequence: "The beam is shuttered: where it points is not known.",
		Do:          "Compare the command with the encoders. Mend or silence the one that is wrong."},
	{Kind: AimUnknown, Scope: OfBeam, Priority: Medium, Seen: true, On: 60 * time.Second, Off: 60 * time.Second, Parents: []Kind{SourcesSilent, AimsDisagree}, Respond: 10 * time.Minute,
		Cause:       "No fresh aim is heard.",
		Consequence: "The beam is shuttered.",
		Do:          "Look at the telescope's control system and its connection."},
	{Kind: ReaderSilent, Scope: OfBeam, Priority: Medium, Seen: true, On: 30 * time.Second, Off: 60 * time.Second, Parents: []Kind{SourcesSilent}, Respond: 10 * time.Minute,
		Cause:       "A beam is open and nobody reads its permit.",
		Consequence: "The shutter should be closed; if it is not, it does not follow the permit.",
		Do:          "Look at the interlock that reads the permit, and at its network."},
	{Kind: WatchMissing, Scope: OfPost, Priority: Medium, Seen: true, On: 60 * time.Second, Off: leastOff, Respond: 10 * time.Minute,
		Cause:       "A required watch post is not staffed.",
		Consequence: "The beams are shuttered.",
		Do:          "Send somebody, and enter the watch."},
	{Kind: ListMissing, Scope: OfAuthority, Priority: Medium, Seen: true, On: 60 * time.Second, Off: 60 * time.Second, Respond: time.Hour,
		Cause:       "A required authority's lists end within two hours, or none is in force.",
		Consequence: "The beams are shuttered from the end of the coverage on.",
		Do:          "Call the authority. Read in its next list; confirm one that waits."},
	{Kind: ListRefused, Scope: OfAuthority, Priority: Medium, Always: true, Seen: true, Off: 60 * time.Second, Respond: time.Hour,
		Cause:       "A closure list was refused, and no good one came since.",
		Consequence: "What was in force stays; the authority's newest word does not count.",
		Do:          "Read the refusal, call the authority, ask for a whole list."},
	{Kind: ReceiverUnreachable, Scope: OfReceiver, Priority: Medium, Always: true, On: 2 * time.Minute, Off: 60 * time.Second, Respond: time.Hour,
		Cause:       "A receiver of alarms cannot be reached.",
		Consequence: "Whoever relies on it is told nothing; its messages wait.",
		Do:          "Look at the receiver and the way to it. Tell its people by another way."},
	{Kind: DiskLow, Scope: OfSite, Priority: Medium, Always: true, On: 60 * time.Second, Off: 60 * time.Second, Respond: 4 * time.Hour,
		Cause:       "Less than a tenth of the data directory's disk is free.",
		Consequence: "When it is full the record cannot be written and every beam is shuttered.",
		Do:          "Make room, or move the data directory to a larger disk."},
	{Kind: RearmWaiting, Scope: OfBeam, Priority: Low, Seen: true, On: 5 * time.Minute, Off: leastOff, Respond: 30 * time.Minute,
		Parents:     []Kind{ShutterFault, Fault, DecisionsStopped, Clock, RecordDamaged, Record, Interlock, DetectorAlarm, WatchMissing},
		Cause:       "A beam waits for a person to re-arm it, and nothing else is told of.",
		Consequence: "The beam stays shuttered.",
		Do:          "Look at the cause named, then re-arm."},
	{Kind: NeighbourSilent, Scope: OfTelescope, Priority: Low, Seen: true, On: 60 * time.Second, Off: 2 * time.Minute, Parents: []Kind{SourcesSilent}, Respond: 30 * time.Minute,
		Cause:       "A neighbour telescope does not say where it points.",
		Consequence: "The beams are shuttered, or its field is kept by its last word only.",
		Do:          "Call the neighbour."},
	{Kind: ShutterSilent, Scope: OfBeam, Priority: Low, Seen: true, On: 60 * time.Second, Off: 2 * time.Minute, Parents: []Kind{ShutterFault, SourcesSilent}, Respond: 30 * time.Minute,
		Cause:       "The shutter no longer says where it is, which is optional here.",
		Consequence: "A shutter that sticks would not be noticed.",
		Do:          "Look at the shutter's feedback and its connection."},
	{Kind: ListWaiting, Scope: OfAuthority, Priority: Low, Always: true, Seen: true, On: 10 * time.Minute, Off: leastOff, Respond: time.Hour,
		Cause:       "A list that opens time waits for a person to confirm it.",
		Consequence: "It closes already and does not open yet.",
		Do:          "Look at what it changes; confirm it, or call the authority."},
	{Kind: SubmissionDue, Scope: OfAuthority, Priority: Low, Always: true, Seen: true, Off: leastOff, Respond: time.Hour,
		Cause:       "An authority's deadline for tonight's targets is within an hour, and none were sent.",
		Consequence: "Without its list the beams stay shuttered.",
		Do:          "Send the target table, and note that it was sent."},
	{Kind: FactsRefused, Scope: OfSource, Priority: Low, Seen: true, On: 60 * time.Second, Off: 2 * time.Minute, Parents: []Kind{SourcesSilent}, Respond: 4 * time.Hour,
		Cause:       "A source sends much that must be refused.",
		Consequence: "What is refused does not count; a source of only bad lines is silent.",
		Do:          "Read the refusals of the source and mend its sender."},
	{Kind: Popups, Scope: OfSite, Priority: Low, Seen: true, Off: 10 * time.Minute, Respond: 4 * time.Hour,
		Cause:       "Three or more aircraft within half an hour were first reported where they could already touch a beam.",
		Consequence: "Reception comes too late for the keep-out to be sure of them.",
		Do:          "Look at the receivers' coverage and latency. Keep spotters on watch."},
	{Kind: NotReady, Scope: OfSite, Priority: Low, Always: true, Off: leastOff, Parents: []Kind{RecordDamaged, Record, Clock, ListRefused, DiskLow}, Respond: 2 * time.Hour,
		Cause:       "Something that tonight needs is not ready.",
		Consequence: "The night may begin late.",
		Do:          "Read the readiness page and see to what it names."},
}

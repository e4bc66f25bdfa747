package demo

import (
	"time"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"

	"beamward/closures"
)

const second = time.Second

// storyLength is the time in which the whole story happens.
const storyLength = 2 * time.Minute

// dawnAt is when, in the story, the Sun reaches the beams' limit.
// The beams are dark some seconds before, by the error of the Sun's place.
const dawnAt = 120 * second

// stars are what the telescopes point at, where they stand at the beginning.
var stars = []star{
	{"f-101", 40 * s1.Degree, 72 * s1.Degree},
	{"f-102", 70 * s1.Degree, 64 * s1.Degree},
	{"r-7", 215 * s1.Degree, 58 * s1.Degree},
	{"r-8", 250 * s1.Degree, 36 * s1.Degree}, // below the limit of beam south
	{"q-1", 330 * s1.Degree, 45 * s1.Degree},
}

// flights are the aircraft of the night. A metre east or north of the site is
// counted along the ground at the site's height.
var flights = []flight{
	{ // far away all night: it proves that the receiver hears
		address: "a10001", at: r3.Vector{X: 52_000, Y: -30_000, Z: 9_000}, speed: 190, track: 120, heard: allNight,
	},
	{ // straight over the site, through the beam of north
		address: "a20002", from: 34500 * time.Millisecond, at: r3.Vector{X: 4_350, Y: 1_580, Z: 9_500}, speed: 240, track: 270,
		heard: []stretch{{20 * second, time.Hour}},
	},
	{ // a transponder that gives no position until it is asked again
		address: "a30003", at: r3.Vector{X: -35_000, Y: 20_000, Z: 8_000}, speed: 200, track: 300,
		heard: []stretch{{41 * second, time.Hour}}, placed: 43 * second,
	},
	{ // passes by, turns towards the beam of north, and away
		address: "a40004", from: 37 * second, at: r3.Vector{X: 2_962, Y: 2_450, Z: 4_500}, speed: 95, track: 270,
		turns: []turn{{stretch{37 * second, 43500 * time.Millisecond}, -12}, {stretch{44500 * time.Millisecond, 57 * second}, 12}},
		heard: []stretch{{20 * second, time.Hour}},
	},
	{ // is lost while it passes by, and seen again beyond
		address: "a50005", from: 53 * second, at: r3.Vector{X: 3_890, Y: 3_700, Z: 8_500}, speed: 200, track: 270,
		heard: []stretch{{40 * second, 46500 * time.Millisecond}, {55500 * time.Millisecond, time.Hour}},
	},
}

var allNight = []stretch{{0, time.Hour}}

// cue is a moment of the story: what the audience is told, and what happens.
type cue struct {
	at   time.Duration
	says string
	does []deed
}

// story is the whole of it, in order of time.
var story = []cue{
	{0, "Night at Skerry Peak. The service starts: nothing is known, so every beam is shuttered.", nil},
	{500 * time.Millisecond, "Telescopes, receiver, interlock, detector and the watch begin to speak.", []deed{
		speak{"north"}, speak{"south"}, speak{"ridge-2"}, speak{"rx-1"}, speak{"catwalk"}, speak{"thermal-1"}, speak{"mast"}, speak{"lasers"},
		point{"north", "f-101", 0}, point{"south", "r-7", 0}, point{"ridge-2", "q-1", 0},
		watch{"east-lot", 67 * second},
	}},
	{2 * second, "The orbital desk's list for the night is put into its folder. It opens time, so it waits for a person.", []deed{bring{"tonight"}}},
	{3500 * time.Millisecond, "An operator looks at it and confirms it.", []deed{confirm{"tonight"}}},
	{4500 * time.Millisecond, "The survey office's list comes over the API.", []deed{bring{"survey"}}},
	{6500 * time.Millisecond, "The receiver has been heard long enough. After a start a person re-arms.", []deed{rearm{"*"}}},

	{10 * second, "The telescope of north goes to its next target.", []deed{point{"north", "f-102", 2 * second}}},
	{11 * second, "South goes to a target that is too low for it, and back.", []deed{point{"south", "r-8", 1500 * time.Millisecond}}},
	{15 * second, "", []deed{point{"south", "r-7", 1500 * time.Millisecond}}},

	{16500 * time.Millisecond, "The orbital desk closes the field of north from 00:20 to 00:22: the beam must be dark before, by the lead, the shutter's time and the readers' clocks.", nil},
	{19 * second, "The encoder of south falls silent.", []deed{silence{"south"}}},
	{23 * second, "It speaks again.", []deed{speak{"south"}}},

	{26 * second, "An aircraft comes straight over the site.", nil},
	{41 * second, "A transponder is heard that gives no position: it could be anywhere, until it gives one.", nil},
	{45500 * time.Millisecond, "An aircraft that was passing by has turned towards the beam of north, and turns away again.", nil},
	{51500 * time.Millisecond, "Another was lost while it passed by. Where it can be grows until it is seen again.", nil},

	{59 * second, "A spotter sees a light near the zenith and says so.", []deed{sight{"spotter-east", 60 * s1.Degree, 70 * s1.Degree, 15 * s1.Degree, 1500 * time.Millisecond}}},
	{63 * second, "The thermal camera raises the alarm.", []deed{detect{"thermal-1", closures.DetectorAlarm}}},
	{64500 * time.Millisecond, "Its sky is clear again; a person looks and re-arms.", []deed{detect{"thermal-1", closures.DetectorClear}}},
	{65 * second, "", []deed{rearm{"*"}}},

	{67 * second, "The watch at the east lot ends and nobody takes over.", nil},
	{69 * second, "The next watch is there; a person re-arms.", []deed{watch{"east-lot", time.Hour}}},
	{69500 * time.Millisecond, "", []deed{rearm{"*"}}},

	{72 * second, "The neighbour's telescope turns to the target of north: its field would be crossed.", []deed{point{"ridge-2", "f-102", 0}}},
	{74 * second, "It turns away.", []deed{point{"ridge-2", "q-1", 0}}},

	{77 * second, "An operator holds every beam.", []deed{hold{"*", "the demo's visitors are on the catwalk"}}},
	{79 * second, "The laser of north emits though its permit is withdrawn: the shutter is not to be trusted.", []deed{stray{"north", true}}},
	{80500 * time.Millisecond, "It is dark again. The hold is released, a person looks and re-arms.", []deed{stray{"north", false}, release{}}},
	{81 * second, "", []deed{rearm{"*"}}},

	{83 * second, "The receiver's connection breaks. Its silence closes; so does what it must prove after it is back.", []deed{silence{"rx-1"}}},
	{87500 * time.Millisecond, "It is back.", []deed{speak{"rx-1"}}},

	{95 * second, "The door of the catwalk opens.", []deed{safe{"catwalk", false}}},
	{96 * second, "It is shut; a person re-arms.", []deed{safe{"catwalk", true}}},
	{96400 * time.Millisecond, "", []deed{rearm{"*"}}},

	{98500 * time.Millisecond, "Somebody sets the machine's clock, by 0.3 s.", []deed{step{300 * time.Millisecond}}},
	{99 * second, "A person looks and re-arms.", []deed{rearm{"*"}}},

	{101 * second, "The machine sleeps for 2.1 s: no decision was made for longer than a lease.", []deed{suspend{2100 * time.Millisecond}}},
	{103500 * time.Millisecond, "A person looks and re-arms.", []deed{rearm{"*"}}},

	{106 * second, "Another program holds the record's file: what is decided cannot be put on record.", []deed{store{false}}},
	{108 * second, "It lets go; a person looks and re-arms.", []deed{store{true}}},
	{108500 * time.Millisecond, "", []deed{rearm{"*"}}},

	{112 * second, "The Sun comes up to the beams' limit. The night is over.", nil},
}

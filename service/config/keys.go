package config

// The tags of a key:
//
//	key      its name in the file
//	need     "yes": it cannot be left out
//	default  what holds when it is left out, in the key's own form
//	form     the form of a text, from forms; absent: any short text
//	words    the words it can be, apart by |
//	label    "yes": it names its list entry in messages
//	only     "kind=a|b": it belongs to entries of those kinds alone, and need
//	         and default hold for them alone
//	doc      what it is, with its unit where the name does not say it

type fileKeys struct {
	Site        siteKeys        `key:"site" need:"yes" doc:"Where the observatory is and how the Earth turns under it."`
	DataDir     text            `key:"data_dir" form:"path" default:"var" doc:"Folder of the record and the permit key."`
	Listen      text            `key:"listen" form:"listen" default:"127.0.0.1:8460" doc:"Address of the API and the console. Off loopback it needs tls and access."`
	Permit      permitKeys      `key:"permit" doc:"How long a permit can be believed, and where it is served."`
	TLS         *tlsKeys        `key:"tls" doc:"Certificate of every listener of this service."`
	Access      *accessKeys     `key:"access" doc:"Who may do what. Without it: the loopback interface only, as one nameless operator."`
	Clock       clockKeys       `key:"clock" doc:"What the clock may do."`
	Rearm       rearmKeys       `key:"rearm" doc:"After which causes a beam waits for a person."`
	Beams       []beamKeys      `key:"beams" need:"yes" doc:"Each beam: one facility behind one shutter."`
	Authorities []authorityKeys `key:"authorities" doc:"Each authority that sends closure lists."`
	Aircraft    *aircraftKeys   `key:"aircraft" doc:"What is kept free of aircraft and how they can move. It goes with sources of kind aircraft."`
	Sources     []sourceKeys    `key:"sources" doc:"Each source of facts."`
	Neighbours  []neighbourKeys `key:"neighbours" doc:"Each telescope whose field a beam must not cross."`
	Watches     []watchKeys     `key:"watches" doc:"Each post of human spotters."`
	Feeds       []feedKeys      `key:"feeds" doc:"How facts come in, besides the API."`
	Layouts     map[string]text `key:"layouts" form:"path" doc:"Layouts by name: files that say how an authority's own text is read."`
	Retention   retentionKeys   `key:"retention" doc:"How long the record keeps what."`
}

type siteKeys struct {
	Name         text    `key:"name" need:"yes" doc:"The site's name, as people know it."`
	TimeZone     text    `key:"time_zone" form:"zone" need:"yes" doc:"The site's zone in the IANA database, or UTC. A night runs from local noon to local noon."`
	Lat          number  `key:"lat_deg" need:"yes" doc:"Geodetic latitude (WGS 84), north positive."`
	Lon          number  `key:"lon_deg" need:"yes" doc:"Longitude, east positive."`
	Height       number  `key:"height_m" need:"yes" doc:"Height above the ellipsoid."`
	GeoidHeight  number  `key:"geoid_height_m" need:"yes" doc:"Height of the geoid above the ellipsoid at the site, for altitudes above mean sea level."`
	UT1UTC       number  `key:"ut1_utc_s" doc:"UT1-UTC in seconds, from IERS Bulletin A or D. Left out, its bound of 0.9 s joins every pointing error."`
	UT1UTCUntil  instant `key:"ut1_utc_until" doc:"Until when ut1_utc_s holds."`
	PressureHPa  number  `key:"pressure_hpa" doc:"Usual pressure at the site itself, not reduced to sea level, for refraction. Left out, an allowance for not knowing it takes its place."`
	TemperatureC number  `key:"temperature_c" doc:"Usual temperature of the air in degrees Celsius. It goes with pressure_hpa."`
}

type permitKeys struct {
	Listen             text     `key:"listen" form:"listen" default:"127.0.0.1:8461" doc:"Address that serves permits alone. Off loopback it needs tls and access."`
	Lease              duration `key:"lease" default:"2s" doc:"Longest life of a permit; at most 10s."`
	Renew              duration `key:"renew" default:"500ms" doc:"How often a reader asks for it."`
	DecisionInterval   duration `key:"decision_interval" default:"100ms" doc:"Longest time between two decisions; from 10ms to a quarter of the lease."`
	ConsumerClockError duration `key:"consumer_clock_error" default:"200ms" doc:"Largest error of a reader's clock against UTC."`
}

type tlsKeys struct {
	Cert     text `key:"cert_file" form:"path" need:"yes" doc:"PEM file of the server's certificate chain."`
	Key      text `key:"key_file" form:"path" need:"yes" doc:"PEM file of its private key, which not everyone may read."`
	ClientCA text `key:"client_ca_file" form:"path" doc:"PEM file of the authorities that sign client certificates."`
}

type accessKeys struct {
	Tokens       text              `key:"tokens_file" form:"path" doc:"File of tokens, kept by the token command; mode 0600."`
	Certificates []certificateKeys `key:"certificates" doc:"Whom a client certificate stands for. It needs tls.client_ca_file."`
}

type certificateKeys struct {
	Name       text   `key:"name" form:"name" need:"yes" label:"yes" doc:"The name on record."`
	Role       text   `key:"role" words:"read|feed|operate|admin" need:"yes" doc:"What it may do."`
	Sources    []text `key:"sources" form:"name" doc:"Sources, beams, neighbours and posts that it may speak for."`
	CommonName text   `key:"common_name" doc:"Subject common name of the certificate. Exactly one of common_name, dns, email and uri is stated."`
	DNS        text   `key:"dns" doc:"DNS name of the certificate."`
	Email      text   `key:"email" doc:"Mail address of the certificate."`
	URI        text   `key:"uri" doc:"URI of the certificate."`
}

type clockKeys struct {
	Synchronised text     `key:"synchronised" words:"required|assumed" default:"required" doc:"required: the kernel must call its clock synchronised. assumed: it is disciplined by means that the kernel does not show; steps are watched all the same."`
	StepLimit    duration `key:"step_limit" default:"100ms" doc:"Largest step of the clock that closes no beam."`
}

type rearmKeys struct {
	ByItself codeList `key:"by_itself" default:"listed-closure, not-covered, aircraft, sighting, field-crossing, hold, elevation-limit, daylight, aim-unknown, slewing, source-silent" doc:"Reason codes after which a beam opens again by itself, or all. After any other an operator re-arms it."`
}

type beamKeys struct {
	ID              text         `key:"id" form:"name" need:"yes" label:"yes" doc:"The beam's name."`
	Launches        []launchKeys `key:"launches" need:"yes" doc:"Where light leaves."`
	AimOf           text         `key:"aim_of" words:"beam|telescope" need:"yes" doc:"What the aim facts state: the beam's own direction, or the telescope's."`
	GuideStar       guideStar    `key:"guide_star" need:"yes" doc:"Where the light that is wanted comes back from."`
	Wavelength      number       `key:"wavelength_nm" need:"yes" doc:"Wavelength in vacuum."`
	Power           number       `key:"power_w" need:"yes" doc:"Average power that leaves the launches together."`
	Aperture        number       `key:"aperture_m" need:"yes" doc:"Diameter of a launch aperture."`
	FocusHeight     number       `key:"focus_height_m" need:"yes" doc:"Height above the ellipsoid at which the beam is focused."`
	Asterism        number       `key:"asterism_radius_arcsec" need:"yes" doc:"Radius about the aim within which every guide star lies."`
	Limits          limitKeys    `key:"limits" need:"yes" doc:"The beam's standing limits."`
	Aim             aimKeys      `key:"aim" need:"yes" doc:"How the beam's aim is believed."`
	ShutterTime     duration     `key:"shutter_time" need:"yes" doc:"Longest time from the withdrawal of a permit until the beam is off; at most 30s."`
	ShutterFeedback text         `key:"shutter_feedback" words:"required|optional" default:"required" doc:"Whether a shutter that is not heard closes the beam."`
	ShutterStale    duration     `key:"shutter_stale_after" default:"5s" doc:"Age at which the shutter's last report no longer counts."`
	ReopenAfter     duration     `key:"reopen_after" default:"5s" doc:"How long a beam stays shuttered after its last closure ended."`
}

type launchKeys struct {
	ID    text   `key:"id" form:"name" need:"yes" label:"yes" doc:"The launch's name within its beam."`
	East  number `key:"east_m" need:"yes" doc:"Metres east of the site."`
	North number `key:"north_m" need:"yes" doc:"Metres north of the site."`
	Up    number `key:"up_m" need:"yes" doc:"Metres above the site's height."`
}

type rayleighKeys struct {
	From  number `key:"from_m" need:"yes" doc:"Lowest height above the ellipsoid from which light is used."`
	Until number `key:"until_m" need:"yes" doc:"Highest height above the ellipsoid from which light is used."`
}

type limitKeys struct {
	ElevationMin number `key:"elevation_min_deg" need:"yes" doc:"Lowest elevation of the beam, as seen through the air."`
	ElevationMax number `key:"elevation_max_deg" need:"yes" doc:"Highest elevation of the beam, as seen through the air."`
	SunBelow     number `key:"sun_below_deg" need:"yes" doc:"The Sun's centre must be lower than this elevation; 90 is no limit."`
}

type aimKeys struct {
	StaleAfter      duration `key:"stale_after" need:"yes" doc:"Age at which an aim no longer counts."`
	Error           number   `key:"error_arcsec" need:"yes" doc:"Hard bound of the pointing error, added to what an aim states."`
	UnannouncedMove number   `key:"unannounced_move_deg" default:"0.1" doc:"A larger move needs a shutter that is confirmed shut."`
}

type authorityKeys struct {
	ID        text     `key:"id" form:"name" need:"yes" label:"yes" doc:"The authority's name, as its lists give it."`
	Required  flag     `key:"required" default:"true" doc:"Whether a beam is closed while no list of this authority covers the instant."`
	Integrity text     `key:"integrity" words:"digest|count|none" default:"digest" doc:"What its lists must prove of their own wholeness."`
	Lead      duration `key:"lead" need:"yes" doc:"How much earlier a closure is taken to start; at most 1h."`
	Tail      duration `key:"tail" need:"yes" doc:"How much later a closure is taken to end; at most 1h."`
	Loosening text     `key:"loosening" words:"at-once|confirm|second-person" default:"second-person" doc:"What a list that opens time waits for: nothing, a person, or a second named person."`
	Folder    text     `key:"folder" form:"path" doc:"Folder into which its lists are put. Left out, none is watched."`
	Layout    text     `key:"layout" form:"name" doc:"Name in layouts by which its texts are read. Left out, they are native."`
	Phone     text     `key:"phone" doc:"Its telephone number, shown to operators."`
	SubmitBy  text     `key:"submit_by" form:"time_of_day" doc:"When targets must be submitted, hh:mm in the site's zone."`
}

type aircraftKeys struct {
	KeepOut        keepOutKeys `key:"keep_out" need:"yes" doc:"The volume about the beam that no aircraft may enter."`
	Motion         motionKeys  `key:"motion" doc:"Bounds of how aircraft can move."`
	Unlocated      text        `key:"unlocated" words:"shutter|alarm" default:"shutter" doc:"What a transponder that gives no position does."`
	LostAfter      duration    `key:"lost_after" default:"60s" doc:"When a track that is no longer heard, lost outside detection_range_m, is dropped."`
	WatchRange     number      `key:"watch_range_m" default:"100000" doc:"Tracks beyond it are put on record once a second."`
	DetectionRange number      `key:"detection_range_m" default:"60000" doc:"A track lost within it stays a closure until it is seen again or released."`
}

type keepOutKeys struct {
	HalfAngle number `key:"half_angle_deg" need:"yes" doc:"Half-angle of the cone about the beam."`
	Radius    number `key:"radius_m" need:"yes" doc:"Radius about the beam that holds at every height."`
	Ceiling   number `key:"ceiling_m" need:"yes" doc:"Height above the ellipsoid over which no aircraft flies."`
}

type motionKeys struct {
	Horizontal number `key:"horizontal_mps2" default:"22" doc:"Largest horizontal acceleration."`
	Vertical   number `key:"vertical_mps2" default:"4" doc:"Largest vertical acceleration."`
	SpeedMax   number `key:"speed_max_mps" default:"350" doc:"Largest speed over ground."`
	ClimbMax   number `key:"climb_max_mps" default:"30" doc:"Largest rate of climb or descent."`
}

type sourceKeys struct {
	ID         text     `key:"id" form:"name" need:"yes" label:"yes" doc:"The source's name, as its facts give it."`
	Kind       text     `key:"kind" words:"aircraft|sighting|detector|interlock|weather" need:"yes" doc:"What it tells of."`
	StaleAfter duration `key:"stale_after" need:"yes" doc:"Age at which its last fact no longer counts and the source is silent."`
	Required   flag     `key:"required" default:"true" doc:"Whether its silence closes; otherwise it is a caution."`

	Latency               duration       `key:"latency" only:"kind=aircraft" default:"5s" doc:"Largest age of a report when it arrives, beyond what it says itself."`
	WarmUp                duration       `key:"warm_up" only:"kind=aircraft" default:"30s" doc:"Unbroken reception that is asked for after the start and after each reconnect."`
	Reception             *receptionKeys `key:"reception" only:"kind=aircraft" doc:"What proves that the antenna hears. With neither key a deaf antenna cannot be told."`
	PositionError         number         `key:"position_error_m" only:"kind=aircraft" default:"2000" doc:"Hard bound of the horizontal error of a report that states none."`
	VerticalError         number         `key:"vertical_error_m" only:"kind=aircraft" default:"300" doc:"Hard bound of the vertical error of a report that states none."`
	VelocityError         number         `key:"velocity_error_mps" only:"kind=aircraft" default:"30" doc:"Hard bound of the horizontal velocity error of a report that states none."`
	VerticalVelocityError number         `key:"vertical_velocity_error_mps" only:"kind=aircraft" default:"10" doc:"Hard bound of the vertical velocity error of a report that states none."`
}

type receptionKeys struct {
	MinMessages      number `key:"min_messages_per_min" default:"0" doc:"Traffic that proves reception; 0 proves nothing."`
	ReferenceAddress text   `key:"reference_address" form:"address24" doc:"24-bit address that is always heard while reception works."`
}

type neighbourKeys struct {
	ID           text          `key:"id" form:"name" need:"yes" label:"yes" doc:"The telescope's name, as its aims give it."`
	Offset       *offsetKeys   `key:"offset" doc:"Where it stands, from the site. One of offset and position is stated."`
	Position     *positionKeys `key:"position" doc:"Where it stands on the Earth."`
	Aperture     number        `key:"aperture_m" need:"yes" doc:"Diameter of its aperture."`
	Field        number        `key:"field_radius_deg" need:"yes" doc:"Radius of its field, where an aim does not state it."`
	Halo         number        `key:"halo_deg" default:"0" doc:"Kept free about the field."`
	AimError     number        `key:"aim_error_arcsec" default:"30" doc:"Hard bound of its pointing error, added to what an aim states."`
	StaleAfter   duration      `key:"stale_after" need:"yes" doc:"Age at which it is silent."`
	WhenSilent   text          `key:"when_silent" words:"shutter|ignore" default:"shutter" doc:"What its silence does."`
	ForgetAfter  duration      `key:"forget_after" need:"yes" doc:"Until when a silent telescope's last aim counts."`
	Yields       text          `key:"yields" words:"ours|theirs|later" default:"ours" doc:"Who gives way; later: the one whose aim began later."`
	Passbands    []band        `key:"passbands_nm" doc:"Ranges of wavelengths in vacuum that it takes, each [from, until]. None: every wavelength matters."`
	OnlyExposing flag          `key:"only_exposing" default:"false" doc:"Whether its field matters only while it says that it is exposing."`
}

type offsetKeys struct {
	East  number `key:"east_m" need:"yes" doc:"Metres east of the site."`
	North number `key:"north_m" need:"yes" doc:"Metres north of the site."`
	Up    number `key:"up_m" need:"yes" doc:"Metres above the site's height, along the site's vertical."`
}

type positionKeys struct {
	Lat    number `key:"lat_deg" need:"yes" doc:"Geodetic latitude (WGS 84), north positive."`
	Lon    number `key:"lon_deg" need:"yes" doc:"Longitude, east positive."`
	Height number `key:"height_m" need:"yes" doc:"Height above the ellipsoid."`
}

type watchKeys struct {
	Post     text     `key:"post" form:"name" need:"yes" label:"yes" doc:"The post's name."`
	Minimum  whole    `key:"minimum" default:"1" doc:"How many people keep the watch at least."`
	Shift    duration `key:"shift" need:"yes" doc:"Longest time that one person keeps it."`
	Overlap  duration `key:"overlap" default:"0s" doc:"How long both are there at a handover."`
	Required flag     `key:"required" default:"true" doc:"Whether a post without its watch closes."`
}

type feedKeys struct {
	Kind    text   `key:"kind" words:"facts-tcp|facts-udp|facts-file|mode-s|asterix-021" need:"yes" doc:"facts-tcp, facts-udp, facts-file: one JSON fact a line. mode-s: Mode S frames in hexadecimal lines. asterix-021: EUROCONTROL ASTERIX category 021."`
	Listen  text   `key:"listen" form:"listen" need:"yes" only:"kind=facts-tcp|facts-udp|asterix-021" doc:"Address at which it is received."`
	Dial    text   `key:"dial" form:"dial" only:"kind=mode-s" doc:"Address that is called. One of dial and file is stated."`
	File    text   `key:"file" form:"path" only:"kind=facts-file|mode-s" doc:"File that is followed."`
	Admits  text   `key:"admits" words:"anyone|token|certificate" default:"anyone" only:"kind=facts-tcp" doc:"What a connection must show; anyone on the loopback interface only."`
	Sources []text `key:"sources" form:"name" only:"kind=facts-tcp|facts-udp|facts-file" doc:"What it may speak for: sources, beams, neighbours, posts."`
	Source  text   `key:"source" form:"name" need:"yes" only:"kind=mode-s|asterix-021" doc:"The source of kind aircraft that it is."`
	Edition text   `key:"edition" form:"edition" default:"2.4" only:"kind=asterix-021" doc:"Edition of the category's specification."`
}

type retentionKeys struct {
	KeepFacts duration `key:"keep_facts" default:"400d" doc:"How long the record keeps facts; digests stay, so that the chain verifies."`
}

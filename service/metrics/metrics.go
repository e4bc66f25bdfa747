package metrics

import (
	"net/http"
	"runtime"
	"slices"
	"sync"
	"time"

	"github.com/prometheus/client_golang/prometheus"
	"github.com/prometheus/client_golang/prometheus/collectors"
	"github.com/prometheus/client_golang/prometheus/promhttp"
)

// Figures is what a scrape reads.
type Figures struct {
	Beams   []Beam
	Facts   []Facts
	Sources []Source
	Lists   map[string]int // by status

	Decide Histogram // from the reading of the clock to the decisions, a turn
	Lag    Histogram // from the arrival of a fact to its turn

	ViewAge       time.Duration // of the published view
	RecordBehind  time.Duration
	RecordDurable uint64
	RecordHealthy bool
	RecordLost    uint64 // entries
	Permits       uint64 // signed
	Turns         uint64
	Panics        uint64
	CutOff        uint64 // watchers that did not keep up
	Aircraft      int
	Ready         bool
}

// Beam is a beam's published state.
type Beam struct {
	ID      string
	Open    bool
	Reasons []string // codes
}

// Facts counts the facts of one kind. Accepted holds those that superseded
// one, too.
type Facts struct {
	Kind                          string
	Accepted, Superseded, Refused uint64
}

// Source is one source of facts.
type Source struct {
	ID       string
	Required bool
	Heard    bool // ever
	Silent   bool
	Age      time.Duration // of its newest fact; meaningless unless Heard
}

// Histogram counts durations: Counts has one more than Bounds, for what is
// longer than the last.
type Histogram struct {
	Bounds []time.Duration
	Counts []uint64
	Sum    time.Duration
}

// Options are what metrics are made of.
type Options struct {
	Read  func() Figures // called at each scrape, by any goroutine
	Build string
}

// Metrics serves the figures. It is safe for concurrent use.
type Metrics struct {
	opt     Options
	handler http.Handler
	descs   map[string]*prometheus.Desc

	mu    sync.Mutex
	last  time.Duration // of the newest Seen, by the boot clock
	beams []Beam        // since then
	spent map[[2]string]time.Duration
}

// New makes metrics in a registry of their own.
func New(o Options) *Metrics {
	m := &Metrics{opt: o, descs: map[string]*prometheus.Desc{}, spent: map[[2]string]time.Duration{}}
	for name, d := range map[string]struct {
		help   string
		labels []string
	}{
		"beam_open":                 {"Whether the beam is open: 1, or 0 for shuttered.", []string{"beam"}},
		"beam_reason":               {"1 for each reason for which the beam is shuttered now.", []string{"beam", "reason"}},
		"beam_state_seconds_total":  {"Time that the beam has spent open, or shuttered for a reason; with several reasons the time counts for each.", []string{"beam", "reason"}},
		"facts_total":               {"Facts by kind and outcome; accepted holds the superseded ones.", []string{"kind", "outcome"}},
		"source_age_seconds":        {"Age of the newest fact of the source; absent while it was never heard.", []string{"source", "required"}},
		"source_silent":             {"Whether the source is silent.", []string{"source", "required"}},
		"lists":                     {"Closure lists by where they stand.", []string{"status"}},
		"decision_seconds":          {"Time from reading the clock to the decisions, a turn.", nil},
		"fact_lag_seconds":          {"Time from the arrival of a fact to its turn.", nil},
		"view_age_seconds":          {"Age of the published decisions. Past three decision intervals they are shown shuttered.", nil},
		"record_behind_seconds":     {"How long the oldest entry that is not on disk has waited.", nil},
		"record_durable_seq":        {"Every entry of the record up to this number is on disk.", nil},
		"record_healthy":            {"Whether nothing is wrong with the record.", nil},
		"record_lost_entries_total": {"Entries that the record refused.", nil},
		"permits_signed_total":      {"Permits that were signed; one without a nonce serves many readers.", nil},
		"turns_total":               {"Turns of the decision loop.", nil},
		"panics_total":              {"Panics of the decision loop.", nil},
		"watchers_cut_off_total":    {"Readers of the decisions that did not keep up.", nil},
		"aircraft":                  {"Aircraft that are known.", nil},
		"ready":                     {"Whether the service does its work.", nil},
		"build_info":                {"The running build: always 1.", []string{"version", "go", "arch"}},
	} {
		m.descs[name] = prometheus.NewDesc("beamward_"+name, d.help, d.labels, nil)
	}
	reg := prometheus.NewRegistry()
	reg.MustRegister(m, collectors.NewGoCollector(), collectors.NewProcessCollector(collectors.ProcessCollectorOpts{}))
	m.handler = promhttp.HandlerFor(reg, promhttp.HandlerOpts{MaxRequestsInFlight: 4, Timeout: 10 * time.Second, DisableCompression: true})
	return m
}

// ServeHTTP answers a scrape.
func (m *Metrics) ServeHTTP(w http.ResponseWriter, r *http.Request) { m.handler.ServeHTTP(w, r) }

// Seen is told of the beams as published, whenever they change and now and
// then, with the boot clock's time. Time before it counts for what was told
// last; time that goes back counts for nothing.
func (m *Metrics) Seen(boot time.Duration, beams []Beam) {
	m.mu.Lock()
	defer m.mu.Unlock()
	m.count(boot)
	m.beams = beams
}

// count adds the time since the newest Seen. m.mu is held.
func (m *Metrics) count(boot time.Duration) {
	spent := boot - m.last
	m.last = boot
	if spent <= 0 || m.beams == nil {
		return
	}
	for _, b := range m.beams {
		if b.Open {
			m.spent[[2]string{b.ID, "open"}] += spent
			continue
		}
		for _, reason := range b.Reasons {
			m.spent[[2]string{b.ID, reason}] += spent
		}
	}
}

// Describe names every figure.
func (m *Metrics) Describe(c chan<- *prometheus.Desc) {
	for _, d := range m.descs {
		c <- d
	}
}

// Collect reads every figure.
func (m *Metrics) Collect(c chan<- prometheus.Metric) {
	f := m.opt.Read()
	send := func(name string, kind prometheus.ValueType, v float64, labels ...string) {
		c <- prometheus.MustNewConstMetric(m.descs[name], kind, v, labels...)
	}
	gauge := func(name string, v float64, labels ...string) { send(name, prometheus.GaugeValue, v, labels...) }
	counter := func(name string, v float64, labels ...string) { send(name, prometheus.CounterValue, v, labels...) }
	for _, b := range f.Beams {
		gauge("beam_open", oneIf(b.Open), b.ID)
		for _, reason := range b.Reasons {
			gauge("beam_reason", 1, b.ID, reason)
		}
	}
	m.mu.Lock()
	spent := make([][2]string, 0, len(m.spent))
	for key := range m.spent {
		spent = append(spent, key)
	}
	slices.SortFunc(spent, func(a, b [2]string) int { return slices.Compare(a[:], b[:]) })
	for _, key := range spent {
		counter("beam_state_seconds_total", m.spent[key].Seconds(), key[0], key[1])
	}
	m.mu.Unlock()
	for _, k := range f.Facts {
		counter("facts_total", float64(k.Accepted), k.Kind, "accepted")
		counter("facts_total", float64(k.Superseded), k.Kind, "superseded")
		counter("facts_total", float64(k.Refused), k.Kind, "refused")
	}
	for _, s := range f.Sources {
		required := map[bool]string{true: "yes", false: "no"}[s.Required]
		if s.Heard {
			gauge("source_age_seconds", s.Age.Seconds(), s.ID, required)
		}
		gauge("source_silent", oneIf(s.Silent || !s.Heard), s.ID, required)
	}
	for status, n := range f.Lists {
		gauge("lists", float64(n), status)
	}
	c <- m.histogram("decision_seconds", &f.Decide)
	c <- m.histogram("fact_lag_seconds", &f.Lag)
	gauge("view_age_seconds", f.ViewAge.Seconds())
	gauge("record_behind_seconds", f.RecordBehind.Seconds())
	gauge("record_durable_seq", float64(f.RecordDurable))
	gauge("record_healthy", oneIf(f.RecordHealthy))
	counter("record_lost_entries_total", float64(f.RecordLost))
	counter("permits_signed_total", float64(f.Permits))
	counter("turns_total", float64(f.Turns))
	counter("panics_total", float64(f.Panics))
	counter("watchers_cut_off_total", float64(f.CutOff))
	gauge("aircraft", float64(f.Aircraft))
	gauge("ready", oneIf(f.Ready))
	gauge("build_info", 1, m.opt.Build, runtime.Version(), runtime.GOARCH)
}

// histogram makes a histogram of counts that are not cumulative.
func (m *Metrics) histogram(name string, h *Histogram) prometheus.Metric {
	buckets, total := map[float64]uint64{}, uint64(0)
	for i, n := range h.Counts {
		if total += n; i < len(h.Bounds) {
			buckets[h.Bounds[i].Seconds()] = total
		}
	}
	return prometheus.MustNewConstHistogram(m.descs[name], total, h.Sum.Seconds(), buckets)
}

func oneIf(yes bool) float64 {
	if yes {
		return 1
	}
	return 0
}

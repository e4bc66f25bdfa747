package replay_test

import (
	"bytes"
	"context"
	"testing"

	"beamward/service/journal"
	"beamward/service/replay"
)

// Whatever is read as an export gives as many entries as it says, in order.
func FuzzExport(f *testing.F) {
	w := newWorld(f, 2, siteText(f))
	w.opened()
	w.flush()
	var b bytes.Buffer
	w.must(w.j.Export(context.Background(), &b, journal.Query{To: 30}))
	f.Add(b.Bytes())
	f.Add([]byte("{\"beamward_record\":1,\"chain\":\"\"}\n{\"end_blocks\":0,\"entries\":0,\"head\":\"\"}\n"))
	f.Fuzz(func(t *testing.T, text []byte) {
		x, err := replay.OpenExport(context.Background(), bytes.NewReader(text))
		if err != nil {
			if x != nil {
				t.Fatal("an export besides an error")
			}
			return
		}
		last := uint64(0)
		err = x.Read(context.Background(), journal.Query{Pruned: func(uint64, uint64, int) error { return nil }}, func(e journal.Entry) error {
			if e.Seq <= last {
				t.Fatalf("entry %d after %d", e.Seq, last)
			}
			last = e.Seq
			return nil
		})
		if err != nil {
			t.Fatal(err)
		}
	})
}

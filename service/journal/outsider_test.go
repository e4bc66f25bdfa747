package journal

import (
	"bufio"
	"bytes"
	"context"
	"crypto/sha256"
	"encoding/base64"
	"encoding/binary"
	"encoding/hex"
	"encoding/json"
	"fmt"
	"testing"
	"time"
)

// proveExport is an outsider's proof of an export: written from the package
// comment alone, with none of the package's code. It returns the first and the
// last digest.
func proveExport(export []byte) (prev, head string, entries int, err error) {
	u := func(b []byte, n int, v int64) []byte {
		w := binary.BigEndian.AppendUint64(nil, uint64(v))
		return append(b, w[8-n:]...)
	}
	var c, seal []byte
	var left int
	var want string
	lines := bufio.NewScanner(bytes.NewReader(export))
	lines.Buffer(nil, 64<<20)
	for n := 1; lines.Scan(); n++ {
		var l map[string]any
		d := json.NewDecoder(bytes.NewReader(lines.Bytes()))
		d.UseNumber()
		if err := d.Decode(&l); err != nil {
			return "", "", 0, fmt.Errorf("line %d: %w", n, err)
		}
		num := func(name string) int64 {
			v, _ := l[name].(json.Number).Int64()
			return v
		}
		text := func(name string) string { s, _ := l[name].(string); return s }
		switch {
		case l["beamward_record"] != nil || l["end_blocks"] != nil:
		case l["first_seq"] != nil:
			if left != 0 {
				return "", "", 0, fmt.Errorf("line %d: %d entries are missing", n, left)
			}
			if prev == "" {
				prev = text("prev")
			} else if text("prev") != head {
				return "", "", 0, fmt.Errorf("line %d: follows another block", n)
			}
			if c, err = hex.DecodeString(text("prev")); err != nil {
				return "", "", 0, err
			}
			seal = append([]byte{2}, c...)
			seal = u(u(u(u(u(seal, 8, num("first_seq")), 8, num("last_seq")), 4, num("count")), 8, num("at_min_us")), 8, num("at_max_us"))
			lists := l["lists"].([]any)
			seal = u(seal, 4, int64(len(lists)))
			for _, x := range lists {
				m := x.(map[string]any)
				name := m["digest"].(string)
				sum, _ := hex.DecodeString(m["sha256"].(string))
				seal = append(append(u(seal, 2, int64(len(name))), name...), sum...)
			}
			head, want, left = text("digest"), text("content"), int(num("count"))
			if l["pruned"] == true {
				c, _ = hex.DecodeString(want)
				left = 0
			}
		default:
			at, err := time.Parse(time.RFC3339Nano, text("at"))
			if err != nil {
				return "", "", 0, err
			}
			body := []byte(text("body"))
			if b64 := text("body_base64"); b64 != "" {
				if body, err = base64.StdEncoding.DecodeString(b64); err != nil {
					return "", "", 0, err
				}
			}
			in := append([]byte{1}, c...)
			in = u(u(u(in, 8, num("seq")), 8, at.Unix()), 4, int64(at.Nanosecond()))
			in = append(u(in, 2, int64(len(text("kind")))), text("kind")...)
			in = append(u(in, 4, int64(len(body))), body...)
			sum := sha256.Sum256(in)
			c = sum[:]
			left--
			entries++
			if text("chain") != hex.EncodeToString(c) {
				return "", "", 0, fmt.Errorf("line %d: the entry does not match its chain value", n)
			}
		}
		if seal != nil && left == 0 && want != "" {
			if hex.EncodeToString(c) != want {
				return "", "", 0, fmt.Errorf("line %d: the content does not match", n)
			}
			sum := sha256.Sum256(append(seal, c...))
			if hex.EncodeToString(sum[:]) != head {
				return "", "", 0, fmt.Errorf("line %d: the block does not match", n)
			}
			want = ""
		}
	}
	return prev, head, entries, lines.Err()
}

func TestOutsiderProvesExport(t *testing.T) {
	dir, _ := small(t)
	j := mustOpen(t, Options{Dir: dir})
	ctx := context.Background()
	must(t, j.Append([]Entry{
		{Seq: 25, At: time.Date(2031, 2, 14, 20, 0, 0, 123456789, time.UTC), Kind: "note", Body: []byte("{\"text\":\"<é> \u2028 \\u0000\"}")},
		{Seq: 26, At: evening, Kind: "note", Body: []byte{0xff, 0, 1}},
		{Seq: 27, At: evening, Kind: "note"},
	}))
	must(t, j.Flush(ctx))
	_, head, err := j.Head(ctx)
	must(t, err)
	export := func(q Query) []byte {
		var b bytes.Buffer
		must(t, j.Export(ctx, &b, q))
		return b.Bytes()
	}
	whole := export(Query{})
	from, to, n, err := proveExport(whole)
	if err != nil || from != (Digest{}).String() || to != head.String() || n != 27 {
		t.Fatalf("whole: %s to %s, %d entries, %v", from, to, n, err)
	}
	if _, to, n, err := proveExport(export(Query{From: 6, To: 10})); err != nil || n != 8 || to == head.String() {
		t.Fatalf("part: %s, %d entries, %v", to, n, err)
	}
	if _, err := j.Prune(ctx, Retention{Before: later}); err != nil {
		t.Fatal(err)
	}
	if _, to, n, err := proveExport(export(Query{})); err != nil || to != head.String() || n != 11 {
		t.Fatalf("pruned: %s, %d entries, %v", to, n, err)
	}
	// A changed word does not pass.
	bad := bytes.Replace(whole, []byte(`\"what\":\"hold\"`), []byte(`\"what\":\"bold\"`), 1)
	if bytes.Equal(bad, whole) {
		t.Fatal("nothing was changed")
	}
	if _, _, _, err := proveExport(bad); err == nil {
		t.Fatal("a changed export was proved")
	}
	if err := j.Export(ctx, &bytes.Buffer{}, Query{Kinds: []string{"aim"}}); err == nil {
		t.Fatal("a choice of kinds was exported")
	}
}

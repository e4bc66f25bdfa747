package journal

import (
	"bufio"
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"time"
	"unicode/utf8"
)

// The lines of an export. Each is one JSON object; which one it is shows in
// its first name.
type (
	exportStart struct {
		Export int    `json:"beamward_record"` // layout, 1
		Chain  string `json:"chain"`           // fixed text: where the chain is described
	}
	exportBlock struct {
		First   uint64       `json:"first_seq"`
		Last    uint64       `json:"last_seq"`
		Count   int          `json:"count"`
		AtMin   int64        `json:"at_min_us"`
		AtMax   int64        `json:"at_max_us"`
		Prev    string       `json:"prev"`
		Lists   []exportList `json:"lists"`
		Content string       `json:"content"`
		Digest  string       `json:"digest"`
		Pruned  bool         `json:"pruned"`
	}
	exportList struct {
		Digest string `json:"digest"`
		Sum    string `json:"sha256"`
	}
	exportEntry struct {
		Seq    uint64  `json:"seq"`
		At     string  `json:"at"`
		Kind   string  `json:"kind"`
		Body   *string `json:"body,omitempty"`        // the exact bytes, as UTF-8 text
		Bytes  []byte  `json:"body_base64,omitempty"` // instead, where they are not UTF-8
		Linked string  `json:"chain"`                 // the chain's value after this entry
	}
	exportEnd struct {
		Blocks  int    `json:"end_blocks"`
		Entries uint64 `json:"entries"`
		Head    string `json:"head"`
	}
)

const exportChain = "c = prev; for each entry c = SHA-256(0x01 | c | seq u64 | seconds i64 | nanos u32 | kind u16+bytes | body u32+bytes); content = c; " +
	"digest = SHA-256(0x02 | prev | first u64 | last u64 | count u32 | at_min_us i64 | at_max_us i64 | lists u32 | for each list: digest u16+bytes, sha256 | content); big endian"

// Export writes the durable entries from q.From to q.To, widened to whole
// blocks, as NDJSON with all that is needed to prove them without this
// program: a line that tells how, then for each block a line with its head
// followed by its entries, and a line with the totals. Pruned blocks appear
// without entries. A q with times or kinds is refused, since part of a block
// proves nothing.
func (r *Reader) Export(ctx context.Context, w io.Writer, q Query) error {
	if !q.Since.IsZero() || !q.Until.IsZero() || len(q.Kinds) > 0 || q.NewestFirst {
		return errors.New("exporting the record: only a range of numbers can be exported, since a choice of entries could not be proved")
	}
	out := bufio.NewWriterSize(w, 1<<16)
	line := json.NewEncoder(out)
	line.SetEscapeHTML(false)
	if err := line.Encode(exportStart{Export: layoutVersion, Chain: exportChain}); err != nil {
		return fmt.Errorf("exporting the record: %w", err)
	}
	var end exportEnd
	err := r.blocks(ctx, q, func(b *block) error {
		content, lines, err := r.exportEntries(b)
		if err != nil {
			return err
		}
		head := exportBlock{
			First: b.first, Last: b.last, Count: b.count, AtMin: b.atMin, AtMax: b.atMax,
			Prev: b.prev.String(), Content: content.String(), Digest: b.digest.String(), Pruned: b.body == nil,
			Lists: []exportList{},
		}
		for _, l := range b.lists {
			head.Lists = append(head.Lists, exportList{Digest: l.digest, Sum: l.sum.String()})
		}
		if err := line.Encode(head); err != nil {
			return fmt.Errorf("exporting the record: %w", err)
		}
		for i := range lines {
			if err := line.Encode(&lines[i]); err != nil {
				return fmt.Errorf("exporting the record: %w", err)
			}
		}
		end.Blocks++
		end.Entries += uint64(len(lines))
		end.Head = head.Digest
		return nil
	})
	if err != nil {
		return err
	}
	if err := errors.Join(line.Encode(end), out.Flush()); err != nil {
		return fmt.Errorf("exporting the record: %w", err)
	}
	return nil
}

func (r *Reader) exportEntries(b *block) (Digest, []exportEntry, error) {
	if b.body == nil {
		return b.content, nil, r.pruned(b)
	}
	content := b.prev
	lines := make([]exportEntry, 0, min(b.count, MaxBlockEntries))
	err := r.each(b, func(e Entry, c Digest) error {
		l := exportEntry{Seq: e.Seq, At: e.At.Format(time.RFC3339Nano), Kind: e.Kind, Linked: c.String()}
		if utf8.Valid(e.Body) {
			text := string(e.Body)
			l.Body = &text
		} else {
			l.Bytes = e.Body
		}
		content = c
		lines = append(lines, l)
		return nil
	})
	return content, lines, err
}

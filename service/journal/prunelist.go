package journal

import (
	"context"
	"slices"
)

// pruneLists drops the texts that are recorded with pruned blocks only and
// that nobody uses.
func (j *Journal) pruneLists(ctx context.Context, keep []string, gone *Pruned) error {
	rows, err := j.db.QueryContext(ctx, `SELECT digest FROM list WHERE text IS NOT NULL
		GROUP BY digest HAVING count(*) = sum(EXISTS (SELECT 1 FROM block WHERE first = list.block AND body IS NULL))
		ORDER BY digest`)
	if err != nil {
		return j.failed("pruning the recorded texts", err)
	}
	defer rows.Close()
	var old []string
	for rows.Next() {
		var digest string
		if err := rows.Scan(&digest); err != nil {
			return j.failed("pruning the recorded texts", err)
		}
		if !slices.Contains(keep, digest) {
			old = append(old, digest)
		}
	}
	if err := rows.Err(); err != nil {
		return j.failed("pruning the recorded texts", err)
	}
	for _, digest := range old {
		dropped, err := j.pruneList(ctx, digest)
		if err != nil {
			return storeError("pruning the recorded texts", err)
		}
		if dropped {
			gone.Lists++
		}
	}
	return nil
}

// pruneList drops one text, unless it came with an Append since Open. It is
// forgotten before it goes, so that an Append meanwhile records it again.
func (j *Journal) pruneList(ctx context.Context, digest string) (bool, error) {
	j.writing.Lock()
	defer j.writing.Unlock()
	j.mu.Lock()
	sum, known := j.lists[digest]
	if j.closed || j.named[digest] || !known {
		j.mu.Unlock()
		return false, nil
	}
	delete(j.lists, digest)
	j.mu.Unlock()
	err := j.store.transact(ctx, "prune", func() error {
		_, err := j.store.conn.ExecContext(ctx, `UPDATE list SET text = NULL WHERE digest = ?`, digest)
		return err
	})
	if err == nil {
		return true, nil
	}
	j.mu.Lock()
	defer j.mu.Unlock()
	if _, again := j.lists[digest]; !again {
		j.lists[digest] = sum
	}
	return false, err
}

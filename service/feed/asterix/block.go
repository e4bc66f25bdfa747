package asterix

import "fmt"

// category is that of reports of ADS-B targets.
const category = 21

// BlockError says why a data block was refused whole.
type BlockError struct {
	Offset int // of the block in the datagram
	Record int // from 1; 0: its head
	Err    error
}

// Error names the place and the cause.
func (e *BlockError) Error() string {
	if e.Record == 0 {
		return fmt.Sprintf("ASTERIX block at octet %d: %v", e.Offset, e.Err)
	}
	return fmt.Sprintf("ASTERIX block at octet %d, record %d: %v", e.Offset, e.Record, e.Err)
}

// Unwrap returns the cause.
func (e *BlockError) Unwrap() error { return e.Err }

// readBlock reads all records of one block's data.
func readBlock(data []byte, offset int, out []Record) ([]Record, error) {
	kept := len(out)
	for n := 0; n < len(data); {
		r, m, err := readRecord(data[n:])
		if err != nil {
			return out[:kept], &BlockError{Offset: offset, Record: len(out) - kept + 1, Err: err}
		}
		out = append(out, r)
		n += m
	}
	return out, nil
}

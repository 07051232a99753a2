package store

import (
	"context"
	"database/sql"
	"encoding/binary"
	"fmt"

	"nightbench/sweeps"
)

// records writes the waveforms kept with a point.
func (w *write) records(point int64, rs []sweeps.Record) error {
	for i, r := range rs {
		codes := make([]byte, 0, 2*len(r.Codes))
		for _, c := range r.Codes {
			codes = binary.LittleEndian.AppendUint16(codes, uint16(c))
		}
		_, err := w.insert(`INSERT INTO record (point, position, node, channel, start, interval, volts_per_code, volts_at_zero, codes)
			VALUES (?, ?, ?, ?, ?, ?, ?, ?, ?)`,
			point, i, r.Node, r.Channel, r.Start, r.Interval, r.VoltsPerCode, r.VoltsAtZero, codes)
		if err != nil {
			return fmt.Errorf("waveform of %s: %w", r.Node, err)
		}
	}
	return nil
}

func scanRecord(rows *sql.Rows) (r sweeps.Record, err error) {
	var codes []byte
	if err = rows.Scan(&r.Node, &r.Channel, &r.Start, &r.Interval, &r.VoltsPerCode, &r.VoltsAtZero, &codes); err != nil {
		return r, err
	}
	r.Codes = make([]int16, len(codes)/2)
	for i := range r.Codes {
		r.Codes[i] = int16(binary.LittleEndian.Uint16(codes[2*i:]))
	}
	return r, nil
}

// Records are the waveforms kept with the point at a setpoint's index; none is
// an empty slice, a setpoint not measured is ErrNotFound.
func (s *Store) Records(ctx context.Context, run int64, index int) ([]sweeps.Record, error) {
	p, err := s.Point(ctx, run, index)
	return p.Records, err
}

// NewestRecord is the newest point of a run that kept a waveform, with its Records, or ErrNotFound.
func (s *Store) NewestRecord(ctx context.Context, run int64) (sweeps.Point, error) {
	indexes, err := collect(ctx, s, scanID, `SELECT setpoint FROM point p WHERE run = ? AND EXISTS (SELECT 1 FROM record WHERE point = p.id) ORDER BY id DESC LIMIT 1`, run)
	if err != nil {
		return sweeps.Point{}, err
	}
	if len(indexes) == 0 {
		return sweeps.Point{}, fmt.Errorf("waveform of run %d: %w: no point has kept one (keep_waveform in the plan says which do)", run, ErrNotFound)
	}
	return s.Point(ctx, run, int(indexes[0]))
}

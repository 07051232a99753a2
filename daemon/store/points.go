package store

import (
	"context"
	"database/sql"
	"fmt"

	"nightbench/instruments/si"
	"nightbench/sweeps"
)

// Points are a run's points in the order they were measured, without waveforms.
func (s *Store) Points(ctx context.Context, run int64) ([]sweeps.Point, error) {
	rows, err := s.points(ctx, `run = ?`, run)
	if err != nil {
		return nil, fmt.Errorf("points of run %d: %w", run, err)
	}
	points := make([]sweeps.Point, len(rows))
	for i, r := range rows {
		points[i] = r.Point
	}
	return points, nil
}

// Point is the point at a setpoint's index, with its waveforms, or ErrNotFound.
func (s *Store) Point(ctx context.Context, run int64, index int) (sweeps.Point, error) {
	rows, err := s.points(ctx, `run = ? AND setpoint = ?`, run, index)
	if err != nil {
		return sweeps.Point{}, fmt.Errorf("point %d of run %d: %w", index, run, err)
	}
	if len(rows) == 0 {
		return sweeps.Point{}, fmt.Errorf("point %d of run %d: %w: it has not been measured", index, run, ErrNotFound)
	}
	p := rows[0].Point
	p.Records, err = collect(ctx, s, scanRecord, `SELECT node, channel, start, interval, volts_per_code, volts_at_zero, codes
		FROM record WHERE point = ? ORDER BY position`, rows[0].id)
	return p, err
}

// pointRow is a point and its row's id.
type pointRow struct {
	sweeps.Point
	id int64
}

// points reads the points that satisfy a condition on table point, oldest
// first. Rows of a point are written with it and never change, so three
// statements see at least what the first saw.
func (s *Store) points(ctx context.Context, where string, args ...any) ([]pointRow, error) {
	points, err := collect(ctx, s, scanPoint, `SELECT id, setpoint, supply_voltage, pot_code, pot_resistance, pot_position, direction, pass, recheck, at, elapsed, flags
		FROM point WHERE `+where+` ORDER BY id`, args...)
	if err != nil || len(points) == 0 {
		return nil, err
	}
	at := make(map[int64]*sweeps.Point, len(points))
	for i := range points {
		at[points[i].id] = &points[i].Point
	}
	of := ` WHERE point IN (SELECT id FROM point WHERE ` + where + `)`
	readings, err := collect(ctx, s, scanReading, `SELECT point, quantity, value, u, dof, unit, road, flags, raw FROM reading`+of+` ORDER BY point, position`, args...)
	if err != nil {
		return nil, err
	}
	for _, r := range readings {
		if p := at[r.point]; p != nil {
			p.Readings = append(p.Readings, r.Reading)
		}
	}
	predictions, err := collect(ctx, s, scanPrediction, `SELECT point, quantity, value, low, high, unit FROM prediction`+of, args...)
	if err != nil {
		return nil, err
	}
	for _, r := range predictions {
		if p := at[r.point]; p != nil {
			p.Predictions[r.quantity] = r.Prediction
		}
	}
	return points, nil
}

func scanPoint(rows *sql.Rows) (p pointRow, err error) {
	p.Readings, p.Predictions = []sweeps.Reading{}, map[sweeps.Quantity]sweeps.Prediction{}
	t := &p.Setpoint
	return p, rows.Scan(&p.id, &t.Index, &t.Supply, &t.PotCode, &t.Pot, &t.Position, &t.Direction, &t.Pass, &t.Recheck, timeColumn{&p.At}, &p.Elapsed, jsonColumn{&p.Flags})
}

type readingRow struct {
	sweeps.Reading
	point int64
}

func scanReading(rows *sql.Rows) (r readingRow, err error) {
	err = rows.Scan(&r.point, &r.Quantity, &r.Value, &r.U, &r.DOF, (*string)(&r.Unit), &r.Road, jsonColumn{&r.Flags}, jsonColumn{&r.Raw})
	if len(r.Raw) == 0 {
		r.Raw = nil
	}
	return r, err
}

type predictionRow struct {
	sweeps.Prediction
	point    int64
	quantity sweeps.Quantity
}

func scanPrediction(rows *sql.Rows) (r predictionRow, err error) {
	var unit string
	err = rows.Scan(&r.point, &r.quantity, &r.Value, &r.Low, &r.High, &unit)
	r.Unit = si.Unit(unit)
	return r, err
}

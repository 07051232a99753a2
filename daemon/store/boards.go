package store

import (
	"context"
	"database/sql"
	"fmt"
)

// BoardFile says which board file a run keeps a copy of.
type BoardFile struct {
	Run    int64
	Name   string
	SHA256 string
}

// BoardFiles are the board files of all runs, newest run first, without their text.
func (s *Store) BoardFiles(ctx context.Context) ([]BoardFile, error) {
	fs, err := collect(ctx, s, scanBoardFile, `SELECT run, name, sha256 FROM file WHERE role = 'board' ORDER BY run DESC`)
	if err != nil {
		return nil, fmt.Errorf("board files: %w", err)
	}
	return fs, nil
}

func scanBoardFile(rows *sql.Rows) (f BoardFile, err error) {
	return f, rows.Scan(&f.Run, &f.Name, &f.SHA256)
}

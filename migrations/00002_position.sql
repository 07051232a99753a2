-- +goose Up

-- Of a board with the pot's wiper in its timing network: the share of the track that charges. 0: no such pot.
ALTER TABLE point ADD COLUMN pot_position REAL NOT NULL DEFAULT 0 CHECK (pot_position BETWEEN 0 AND 1);

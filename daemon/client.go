package main

import (
	"bytes"
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"net"
	"net/http"
	"syscall"

	"nightbench/daemon/app"
)

// client talks to the daemon that holds a bench, through its socket in the state folder.
type client struct {
	dir  string
	http http.Client
}

func newClient(dir string) *client {
	dial := func(ctx context.Context, _, _ string) (net.Conn, error) {
		return (&net.Dialer{}).DialContext(ctx, "unix", app.Socket(dir))
	}
	return &client{dir: dir, http: http.Client{Transport: &http.Transport{DialContext: dial}}}
}

// problem is the daemon's error (RFC 9457).
type problem struct {
	Status int    `json:"status"`
	Title  string `json:"title"`
	Detail string `json:"detail"`
	Errors []struct {
		Message  string `json:"message"`
		Location string `json:"location"`
	} `json:"errors"`
}

// do sends a request; in and out may be nil.
func (c *client) do(ctx context.Context, method, path string, in, out any) error {
	var body io.Reader
	if in != nil {
		b, err := json.Marshal(in)
		if err != nil {
			return err
		}
		body = bytes.NewReader(b)
	}
	req, err := http.NewRequestWithContext(ctx, method, "http://localhost"+path, body)
	if err != nil {
		return err
	}
	req.Header.Set("Content-Type", "application/json")
	resp, err := c.http.Do(req)
	if err != nil {
		return c.unreachable(err)
	}
	defer resp.Body.Close()
	if resp.StatusCode >= 300 {
		return refusal(resp)
	}
	if out == nil {
		return nil
	}
	return json.NewDecoder(resp.Body).Decode(out)
}

func (c *client) unreachable(err error) error {
	if errors.Is(err, fs.ErrNotExist) || errors.Is(err, syscall.ECONNREFUSED) {
		return fmt.Errorf("no daemon holds a bench in %s: start one with 'nightbench serve BENCH', or name its state folder with --state DIR", c.dir)
	}
	return fmt.Errorf("the daemon in %s: %w", c.dir, err)
}

// refused is the daemon's no, with its status.
type refused struct {
	status int
	words  string
}

func (r *refused) Error() string { return r.words }

// refusal turns the daemon's problem into an error with the exit status that fits.
func refusal(resp *http.Response) error {
	var p problem
	if err := json.NewDecoder(resp.Body).Decode(&p); err != nil || p.Detail == "" && p.Title == "" {
		return fmt.Errorf("the daemon answered %s", resp.Status)
	}
	words := p.Detail
	for _, e := range p.Errors {
		words += "\n" + e.Message
	}
	err := error(&refused{resp.StatusCode, words})
	if resp.StatusCode == http.StatusUnprocessableEntity || resp.StatusCode == http.StatusBadRequest {
		return &exit{exitUsage, err}
	}
	return err
}

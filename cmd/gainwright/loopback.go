package main

import (
	"bufio"
	"context"
	"errors"
	"fmt"
	"io"
	"net"
	"net/textproto"
	"net/url"
	"strings"
	"sync"
	"time"
)

// The page's server knows of HTTP/1.1 (RFC 9112) what one reader on this machine needs:
// GET, one request a connection, an answer of known length. A whole HTTP library would
// add a third to the program.

const (
	longestRequest  = 16 << 10 // request line and headers
	requestTime     = 5 * time.Second
	answerTime      = 30 * time.Second
	mostConnections = 128
)

// request is what a browser asked for.
type request struct {
	method string
	url    *url.URL
	header textproto.MIMEHeader
	gone   context.Context // ends when the server does
}

// answer is what it gets.
type answer struct {
	status int
	header [][2]string
	body   []byte
}

// reasons are the words of the status codes that are used.
var reasons = map[int]string{200: "OK", 204: "No Content", 400: "Bad Request", 403: "Forbidden", 404: "Not Found",
	405: "Method Not Allowed", 500: "Internal Server Error", 503: "Service Unavailable"}

// serveLoopback answers requests until the context ends, and waits for those under way.
func serveLoopback(ctx context.Context, listener net.Listener, respond func(*request) answer) error {
	var open sync.WaitGroup
	defer open.Wait()
	stopped := context.AfterFunc(ctx, func() { listener.Close() })
	defer stopped()
	room := make(chan struct{}, mostConnections)
	for {
		conn, err := listener.Accept()
		if err != nil {
			if ctx.Err() != nil || errors.Is(err, net.ErrClosed) {
				return nil
			}
			var passing net.Error
			if errors.As(err, &passing) && passing.Timeout() {
				continue
			}
			return err
		}
		select {
		case room <- struct{}{}:
		default:
			conn.Close()
			continue
		}
		open.Add(1)
		go func() {
			defer func() { <-room; open.Done() }()
			converse(ctx, conn, respond)
		}()
	}
}

// converse reads one request and answers it.
func converse(ctx context.Context, conn net.Conn, respond func(*request) answer) {
	defer conn.Close()
	// Ending the server ends the reading too.
	stop := context.AfterFunc(ctx, func() { _ = conn.SetDeadline(time.Now()) })
	defer stop()
	if err := conn.SetDeadline(time.Now().Add(requestTime)); err != nil {
		return
	}
	r, err := readRequest(conn)
	a := answer{status: 400}
	switch {
	case errors.Is(err, io.EOF):
		return
	case err == nil:
		gone, leave := context.WithCancel(ctx)
		r.gone = gone
		_ = conn.SetDeadline(time.Time{})
		go watchLeaving(conn, leave)
		a = respond(r)
		leave()
	}
	if err := conn.SetDeadline(time.Now().Add(answerTime)); err != nil {
		return
	}
	var b strings.Builder
	fmt.Fprintf(&b, "HTTP/1.1 %d %s\r\nConnection: close\r\n", a.status, reasons[a.status])
	if a.status != 204 {
		fmt.Fprintf(&b, "Content-Length: %d\r\n", len(a.body))
	}
	for _, h := range a.header {
		fmt.Fprintf(&b, "%s: %s\r\n", h[0], h[1])
	}
	b.WriteString("\r\n")
	if _, err := io.WriteString(conn, b.String()); err == nil {
		_, _ = conn.Write(a.body) // a browser that has gone away needs no answer
	}
}

// watchLeaving hears when the browser closes the connection; what it sends more is not read.
func watchLeaving(conn net.Conn, leave func()) {
	_, _ = conn.Read(make([]byte, 1))
	leave()
}

var errBadRequest = errors.New("not a request")

// readRequest reads the request line and the headers; a request with a body is refused.
func readRequest(conn io.Reader) (*request, error) {
	text := textproto.NewReader(bufio.NewReader(io.LimitReader(conn, longestRequest)))
	line, err := text.ReadLine()
	if err != nil {
		return nil, io.EOF
	}
	method, rest, ok := strings.Cut(line, " ")
	target, version, found := strings.Cut(rest, " ")
	if !ok || !found || version != "HTTP/1.1" && version != "HTTP/1.0" || !strings.HasPrefix(target, "/") {
		return nil, errBadRequest
	}
	u, err := url.ParseRequestURI(target)
	if err != nil {
		return nil, errBadRequest
	}
	header, err := text.ReadMIMEHeader()
	if err != nil || len(header["Host"]) != 1 || len(header["Origin"]) > 1 || header.Get("Transfer-Encoding") != "" ||
		header.Get("Content-Length") != "" && header.Get("Content-Length") != "0" {
		return nil, errBadRequest
	}
	return &request{method: method, url: u, header: header}, nil
}

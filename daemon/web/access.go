package web

import (
	"context"
	"crypto/sha256"
	"crypto/subtle"
	"net"
	"net/http"
	"net/netip"
	"strings"
)

// The browser's safeguards, on every answer. The page loads nothing from elsewhere and no other page may frame it.
var headers = map[string]string{
	"X-Content-Type-Options":       "nosniff",
	"X-Frame-Options":              "DENY",
	"Referrer-Policy":              "no-referrer",
	"Cross-Origin-Opener-Policy":   "same-origin",
	"Cross-Origin-Resource-Policy": "same-origin",
	"Permissions-Policy":           "camera=(), microphone=(), geolocation=(), usb=(), serial=()",
}

// policy is the content security policy for a page at a host. The websocket's
// address is named since not every browser counts it as 'self'.
func policy(host string) string {
	return "default-src 'none'; script-src 'self'; style-src 'self'; img-src 'self' data:; font-src 'self'; manifest-src 'self'; " +
		"connect-src 'self' ws://" + host + "; base-uri 'none'; form-action 'none'; frame-ancestors 'none'"
}

// accessKey is where guard leaves what a request may do; peerKey where a connection over the socket is marked.
type (
	accessKey struct{}
	peerKey   struct{}
)

// mayControl tells whether the request's caller may command the bench.
func mayControl(ctx context.Context) bool {
	may, _ := ctx.Value(accessKey{}).(bool)
	return may
}

// markPeer marks connections over a unix socket: the file's mode 0600 has let the peer in already.
func markPeer(ctx context.Context, c net.Conn) context.Context {
	_, unix := c.LocalAddr().(*net.UnixAddr)
	return context.WithValue(ctx, peerKey{}, unix)
}

// guard sets the safeguards, turns away foreign hosts and origins, and notes what the caller may do.
func (s *Server) guard(next http.Handler) http.Handler {
	return http.HandlerFunc(func(w http.ResponseWriter, r *http.Request) {
		h := w.Header()
		for k, v := range headers {
			h.Set(k, v)
		}
		if strings.HasPrefix(r.URL.Path, "/api/") {
			h.Set("Cache-Control", "no-store")
		}
		peer, _ := r.Context().Value(peerKey{}).(bool)
		if words := foreign(r, peer); words != "" {
			answerProblem(w, Forbidden, words)
			return
		}
		if !peer {
			h.Set("Content-Security-Policy", policy(r.Host))
		}
		may := peer || s.holdsToken(r)
		next.ServeHTTP(w, r.WithContext(context.WithValue(r.Context(), accessKey{}, may)))
	})
}

// foreign says in words why a request is turned away: a name that is not
// loopback's may have been bent to point here (DNS rebinding), and an origin
// that is not ours is another site's page talking through someone's browser.
func foreign(r *http.Request, peer bool) string {
	if !peer && !ours(r) {
		return "host " + r.Host + " is not this daemon's: use the address it printed, on this computer"
	}
	if origin, sent := r.Header["Origin"]; sent && (peer || len(origin) != 1 || origin[0] != "http://"+r.Host) {
		return "a page from " + strings.Join(origin, ", ") + " may not talk to this bench"
	}
	return ""
}

// ours tells whether the Host header is a loopback name with the port that was connected to.
func ours(r *http.Request) bool {
	local, ok := r.Context().Value(http.LocalAddrContextKey).(net.Addr)
	if !ok {
		return false
	}
	_, want, err := net.SplitHostPort(local.String())
	if err != nil {
		return false
	}
	host, port, err := net.SplitHostPort(r.Host)
	if err != nil { // no port: the scheme's own
		host, port = strings.Trim(r.Host, "[]"), "80"
	}
	return port == want && loopback(host)
}

func loopback(host string) bool {
	if strings.EqualFold(host, "localhost") {
		return true
	}
	a, err := netip.ParseAddr(host)
	return err == nil && a.IsLoopback()
}

// holdsToken compares digests, so that the time taken tells nothing of token or length.
func (s *Server) holdsToken(r *http.Request) bool {
	given, bearer := strings.CutPrefix(r.Header.Get("Authorization"), "Bearer ")
	if !bearer || s.o.Token == "" {
		return false
	}
	a, b := sha256.Sum256([]byte(given)), sha256.Sum256([]byte(s.o.Token))
	return subtle.ConstantTimeCompare(a[:], b[:]) == 1
}

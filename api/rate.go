package api

import (
	"fmt"
	"math"
	"net/http"
	"strconv"
	"sync"
	"time"

	"golang.org/x/time/rate"

	"jointledger/service"
)

// limiter gives every caller the same number of requests a second, with a
// burst of one second's worth.
type limiter struct {
	perSecond float64 // 0: no limit
	mu        sync.Mutex
	callers   map[string]*rate.Limiter
}

// mostRemembered is how many callers' rates are kept; callers are named by the
// ledger's owner, so that reaching it means nothing but forgetting bursts.
const mostRemembered = 10_000

func newLimiter(perSecond float64) *limiter {
	return &limiter{perSecond: perSecond, callers: map[string]*rate.Limiter{}}
}

// take counts a request and says, in the RateLimit header fields, what is
// left.
func (l *limiter) take(caller service.Caller, header http.Header) error {
	if l.perSecond <= 0 {
		return nil
	}
	burst := int(math.Max(1, math.Ceil(l.perSecond)))
	l.mu.Lock()
	one := l.callers[caller.Name]
	if one == nil {
		if len(l.callers) >= mostRemembered {
			clear(l.callers)
		}
		one = rate.NewLimiter(rate.Limit(l.perSecond), burst)
		l.callers[caller.Name] = one
	}
	l.mu.Unlock()
	now := time.Now()
	allowed := one.AllowN(now, 1)
	left := math.Max(0, one.TokensAt(now))
	wait := int(math.Ceil((1 - math.Min(1, left)) / l.perSecond))
	header.Set("RateLimit-Policy", fmt.Sprintf(`"caller";q=%d;w=1`, burst))
	header.Set("RateLimit", fmt.Sprintf(`"caller";r=%d;t=%d`, int(left), wait))
	if !allowed {
		header.Set("Retry-After", strconv.Itoa(max(1, wait)))
		return &service.Problem{Code: service.RateLimited, Detail: fmt.Sprintf("%s has used up %g requests a second.", caller.Name, l.perSecond)}
	}
	return nil
}

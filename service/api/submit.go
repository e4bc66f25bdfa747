package api

import (
	"context"
	"errors"
	"net/http"
	"time"

	"beamward/closures"
)

// submit gives a person's word to the decision loop and returns once it is in
// force and on record.
func (c *call) submit(body closures.Body) error {
	// The word counts whether or not whoever sent it stays to hear so.
	ctx, cancel := context.WithTimeout(context.WithoutCancel(c.r.Context()), c.api.limits.Durable)
	defer cancel()
	c.longer(c.api.limits.Durable + c.api.limits.Answer)
	err := c.api.options.Engine.SubmitDurable(ctx, closures.Source(c.who.Name), body)
	var core *closures.Error
	switch {
	case err == nil:
		return nil
	case errors.As(err, &core):
		if core.Code == closures.Busy && c.api.options.Engine.View().Stopped {
			return refuse(http.StatusServiceUnavailable, core.Message, core.Mend).after(time.Second)
		}
		return err
	case ctx.Err() != nil:
		return refuse(http.StatusServiceUnavailable, "it is not known to be on record: it may be in force already",
			"look whether it is; if not, send it again, with the same Idempotency-Key where there was one").after(time.Second)
	}
	return err
}

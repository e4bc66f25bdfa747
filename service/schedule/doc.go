// Package schedule runs work at set times of the site's day: the check of the
// record's chain, pruning, and what else is named in a table of jobs.
//
// Times are cron expressions (robfig/cron) in the site's zone, so that a change
// to or from summer time neither skips a job nor runs it twice. A run that was
// missed while the service was down is caught up once at the start. Time comes
// from the service's clock, so a virtual night schedules virtually.
//
// Jobs run one after another; a job that panics or errs is told and does not
// stop the others. Nothing here can touch a permit.
package schedule

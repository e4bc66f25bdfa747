// Package metrics shows the service's figures to Prometheus, in a registry of
// its own.
//
// What is read at a scrape is asked for then, as one Figures; only the time
// that beams spend in each state is counted here, from what the decision loop
// tells. Nothing rests on any of it. Rules for alarms that are made of these
// figures need an absent() rule beside them: a service that has died tells no
// figures.
package metrics

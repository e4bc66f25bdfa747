package closures

// DurableVersion is the number that Durable returns, without the work of
// gathering what is durable.
func (s *State) DurableVersion() uint64 { return s.durable }

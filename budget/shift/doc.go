// Package shift tells when and where a run would have emitted least.
//
//  1. profile: a [Profile] is the machine's power over the run's own time,
//     between samples or in constant steps.
//  2. price: a [Run] at a [Place] has one [Total] for every start, operational
//     and embodied together; none where it would meet a hole of the series.
//  3. when: [DeferredStart] and [InterruptedRun] find the least total.
//  4. where: [Sites] compares places, [Spreads] all starts of the whole days
//     that their series know.
//
// Nothing is forecast here. A series that has been lengthened with expected
// intensities is priced like any other; an annual mean is never used, for it
// makes every start look alike.
package shift

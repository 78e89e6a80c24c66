// Package forecast tells where the period of a budget will end if runs go on
// as scheduled: the landing, with its interval.
//
//  1. calendar: [Holding] gives the day, week, month, quarter or year that holds
//     a moment, in the account's time zone.
//  2. schedule: [Schedule.Firings] are the scheduled starts in it, and [Left]
//     those that are still to be expected. [RateOf] counts runs that have no
//     schedule.
//  3. terms: each job's runs left are priced with the intensity that is expected
//     at their hours, from what is known of the series now.
//  4. doubt: the same prediction is made as of every past day of the series and
//     held against what came. Its errors, the spread of the runs, the ratio of a
//     change and the count of unscheduled runs make the interval.
//
// Nothing here looks at a clock: what is known is what lies before Now.
package forecast

// Package cluster lays out a sweep as a folder that a batch system, a few
// machines or one machine at a time can work through: the job's manifest, the
// scripts that submit and run it for Slurm, a ledger a shard, and the logs.
//
// A shard is every so many-th unit of the sweep and has a ledger of its own,
// DIR/shards/0003. One ledger for all would do too, as every writer has a file
// of its own, but each task would read all files of all others when it begins,
// a thousand times a thousand on a network file system. The same shard may run
// twice at once, as happens when a node is lost and comes back: both write the
// same figures, each into its own file, and no lock is needed.
//
// What is done is judged by the ledgers alone: a batch system forgets, and may
// be down. The room knows no flags and starts nothing; the command line calls it.
// It refuses a folder that holds another job or other files, and a manifest that
// was changed by hand.
package cluster

// Package slurm has the work of steps done by a Slurm cluster that shares a
// folder with this machine: the folder of the store and that of the report must
// be the same, under the same path, on every node.
//
// The elements of a fan-out are cut into chunks of about the same computing
// time, and the chunks of a step are submitted as job arrays; a plain step is
// one chunk. The parent submits a step when its needs are there, so Slurm knows
// nothing of the order of steps. All that a chunk is computed from lies in a
// folder, the batch:
//
//	STEP-1a2b3c4d/
//	  work.json        what the step computes with, by the names of objects in
//	                   the store; who made it, and with what program
//	  chunk-0007.json  the units of a chunk: a step, or elements of a fan-out
//	  jobs             the arrays: first chunk, number of chunks, job id
//	  progress-0007    what became of the units of a chunk, a line each, appended
//	                   to by the node; -0007.1 after the first requeue, and so on
//	  log-17_3.txt     what element 3 of array 17 had to say
//
// On the node, this same program, copied beside the batches, reads the batch
// (see [RunChunk]), refuses to work when anything about it could give other
// numbers than the parent's, computes in confined workers, and puts results and
// records into the store itself. A unit is done when its record is in the
// store. What progress and squeue say tells the parent where to look, and when
// to look no longer: a chunk that left the queue with units undone is submitted
// again, a stated number of times.
//
// Jobs outlive a parent that dies. The next one finds their batches, takes part
// in what is still in the queue, and submits the rest.
//
// Of Slurm's commands, sbatch, squeue, scancel and scontrol show config are
// used. No accounting (sacct) is needed.
package slurm

"""Answers to questions: what a network says of some columns, given what is seen and what is set.

A map of this folder, in the order in which a question walks through it:

- The question: `levers` and `pins` are what is asked in a user's words; `naming` and `lever_checks` hold them against
  the network; `settings` is a lever as places in it; `question` is the whole, checked.
- Its worlds: `scenes` names a world (recorded, among, set, had, against) and what was read of it; `worlds` makes tables
  of one with categories alone, `splitting` makes nodes of one with numbers (what `mixed` holds).
- The route: `asking` goes from a question to an answer; `planner` picks the cheapest route for every world;
  `contradicting` names the pins that cannot be together; `drawing` and `kept` keep drawn parameters and plans.
- Exactly, categories: `orders` finds in which order to sum, `tree` sums for all columns at once, `summing` keeps both.
- Exactly, numbers: `mixing` chooses between this and sampling; `layout` divides a world into blocks of numbers,
  `linear` adds them up and gives them values, `blocks` makes each a factor, `exact_mixed` runs a tree over these.
  `normal`, `bivariate` and `cutting` are normals in intervals; `mixture` is the distribution of a number.
- Sampling: `weighting` weighs particles of several worlds at once; `sampling` knows a world before, `particles` are the
  cases made up, `weighed` and `tallies` sum them; `truncated` draws inside intervals.
- The answer: `marginal` is one column in one world, `answer` all of them; `counting` adds the records; `doubt`
  pools the answers of plausible graphs.
- Many rows at once: `predicting`, by `blanket` where everything around a column is known, else by `hidden`.
"""

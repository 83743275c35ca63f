/** A study with comments, both ways of writing maps and lists, and uneven spacing, to be edited. */
export const SAMPLE = `# two valleys, invented
study: Two valleys                # title
seed: valley-1                    # any text
replicates: 4
generations: 6

population:
  households: 300
  places: 10                      # villages
  groups:
    - {name: lowland, share: 0.65}
    - {name: upland, share: 0.35, relative_wealth: 0.5, preferences: {child_weight: 0.33}}   # poorer
  wealth:
    shape: lognormal
    mean: 100
    gini: 0.42                    # or sd_log
    between_places: 0.4

technology: {kind: linear, gross_return: 2.5}   # per generation
shock: {sd_log: 0.2}

preferences:
  curvature: 0.6                  # σ
  child_weight: 0.35

reference:
  milestones:
    - weight: 0.6
      mix:
        - {from: self, weight: 0.1}
        # they look up
        - {from: neighbours, statistic: upward_mean, weight: 0.7}
        - {from: society, statistic: mean, weight: 0.2}

arms:
  - name: segregated
    network: {kind: blocks, mean_degree: 10, within_place: 0.9, within_group: 0.8}
  - name: "mixed"                 # the other arm
    network:
      from: segregated
      mixing: {share: 0.5}
# the end
`;

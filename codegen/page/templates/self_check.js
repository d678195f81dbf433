/* Whether this browser computes what the compiled C did, in doubles: every number of every branch, bit for bit. */

function differences({ joints, seed, pose, statuses, branches }) {
  const reached = kinematics.pose();
  kinematics.forward(joints, reached);
  const found = branches.map(() => Array(count).fill(NaN)), states = [];
  kinematics.inverse_all(reached, seed, found, states);
  const computed = [...reached.r.flatMap((row) => [...row]), ...reached.p, ...states];
  const wanted = [...pose, ...statuses];
  branches.forEach((values, b) => {
    if (values === null) return;
    wanted.push(...values);
    computed.push(...found[b]);
  });
  return { compared: wanted.length, different: wanted.filter((value, k) => !Object.is(value, computed[k])).length };
}

function checkSelf() {
  const results = arm.vectors.map(differences);
  const [compared, different] = ["compared", "different"].map((key) => results.reduce((sum, one) => sum + one[key], 0));
  const line = element("self-check");
  line.classList.add(different === 0 ? "good" : "bad");
  line.replaceChildren(
    made("b", "", different === 0 ? "The same bits." : "Not the same bits."),
    ` In this browser, at ${results.length} poses and on every branch, ${different} of ${compared} numbers differ from those of the compiled C.`,
  );
}
setTimeout(checkSelf, 50);

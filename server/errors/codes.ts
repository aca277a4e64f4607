/**
 * Every error that a user can meet, once: its code never changes, and `server/errors/ERRORS.md`
 * has an entry for each (a test holds the two together).
 *
 * The code's first part says where it comes from: WIRE, LINK, RIG, RULES, GUARD, RECORD, EXPORT,
 * ALIGN, REPORT, ANIMALS, BLINDING, REHEARSE, PLAN, LOOP, WEB, CLI.
 */
export interface ErrorEntry {
  readonly code: string;
  /** What happened, in one line, without the particulars. */
  readonly meaning: string;
  /** What to do about it. */
  readonly remedy: string;
}

function entry(code: string, meaning: string, remedy: string): ErrorEntry {
  return { code, meaning, remedy };
}

export const ERRORS = {
  linkPortMissing: entry(
    'LINK_PORT_MISSING',
    'The serial port does not exist.',
    'Run `lapwing ports` to see what is connected, check the cable, and put the path into the rig file.',
  ),
  linkPortBusy: entry(
    'LINK_PORT_BUSY',
    'Another program has the serial port open.',
    'End that program (a serial monitor, another Lapwing) and start again.',
  ),
  linkPermission: entry(
    'LINK_PERMISSION',
    'This user may not open the serial port.',
    'Join the group that owns it, `sudo usermod -aG dialout $USER` on Debian and Ubuntu, then log out and in again.',
  ),
  linkOpenFailed: entry(
    'LINK_OPEN_FAILED',
    'The serial port could not be opened or set up.',
    'Check that the path is a serial device (`lapwing ports`) and that it can run at the baud rate in the rig file.',
  ),
  linkBadAddress: entry(
    'LINK_BAD_ADDRESS',
    'The port is neither a device path nor `tcp://host:port`.',
    'Write a path such as /dev/serial/by-id/..., or tcp://127.0.0.1:7001; `lapwing ports` lists what is connected.',
  ),
  linkTcpRefused: entry(
    'LINK_TCP_REFUSED',
    'Nothing listens at the address of the simulated board.',
    'Start the simulated board first, and check the host and port in the rig file.',
  ),
  linkTcpUnreachable: entry(
    'LINK_TCP_UNREACHABLE',
    'The address of the simulated board cannot be reached.',
    'Check the host name, the network and any firewall between the two.',
  ),
  linkUnplugged: entry(
    'LINK_UNPLUGGED',
    'The port closed by itself.',
    "Check the USB cable and the board's power; Lapwing reconnects by itself when the board is back.",
  ),
  linkSilent: entry(
    'LINK_SILENT',
    'The board fell silent: no good frame came for 250 ms.',
    'Check the cable and the board; Lapwing reconnects by itself. If it recurs, look for a loose plug or a sleeping USB hub.',
  ),
  linkWriteFailed: entry(
    'LINK_WRITE_FAILED',
    'The port did not take a whole command.',
    'Lapwing reconnects by itself, and no part of the command is sent again. If it recurs, replace the cable or the USB hub.',
  ),
  linkTagEnded: entry(
    'LINK_TAG_ENDED',
    'The board ended the connection: it was reset, or had not heard from the host for too long.',
    'Lapwing connects again by itself. Look for a brown-out of the board, or a host too busy to answer.',
  ),
  linkNoAnswer: entry(
    'LINK_NO_ANSWER',
    'The port is open, but no Lapwing board answers.',
    'Check that this is the right port (`lapwing ports`), that the board has Lapwing firmware, and the baud rate in the rig file.',
  ),
  linkProtocol: entry(
    'LINK_PROTOCOL',
    'The board speaks another version of the wire protocol.',
    'Load the firmware that comes with this version of Lapwing onto the board, or use the version of Lapwing that it was made for.',
  ),
  linkOtherBoard: entry(
    'LINK_OTHER_BOARD',
    'The board that answered is not the one that the rig file names.',
    'Connect the board with that number, or put the number of this one into the rig file as `board_id`.',
  ),
  flashFailed: entry(
    'FLASH_FAILED',
    'The firmware could not be put on the board.',
    "Close everything that has the port open, press the board's reset button just before, and try again; small boards with an old boot loader need `--baud 57600`. `lapwing flash` alone prints the command.",
  ),
  selftestOutputs: entry(
    'SELFTEST_OUTPUTS',
    'The self test makes outputs pulse, so nothing may be wired to them.',
    'Unplug valves, lasers and everything else from the outputs, then say so with `--outputs-free`.',
  ),
  rigUnreadable: entry(
    'RIG_UNREADABLE',
    'The rig file cannot be read.',
    'Check the path given to `--rig` and its permissions.',
  ),
  rigInvalid: entry(
    'RIG_INVALID',
    'The rig file does not describe a rig.',
    'Correct each place named; `hardware-sim/demo/rig.yaml` is a whole example.',
  ),
  calibrationBad: entry(
    'CALIBRATION_BAD',
    'A stored calibration cannot be read, or is none.',
    'Check the name in the rig file and the folder it names; `server/session/rig/calibration.schema.json` says what is in a file. A calibration is made with `lapwing calibrate`.',
  ),
  calibrationUnstored: entry(
    'CALIBRATION_UNSTORED',
    'A calibration could not be kept, or not be put in force.',
    'Check that the folder of the rig file can be written, then measure again or put the name into the rig file by hand.',
  ),
  preflightAgainst: entry(
    'PREFLIGHT_AGAINST',
    'The pre-flight of this rig failed, or none was made.',
    'Make one: on the Rig page, or `lapwing preflight --rig RIG`, a minute. Or give the reason to begin all the same (`--despite`); it is kept with the session.',
  ),
  preflightUnstored: entry(
    'PREFLIGHT_UNSTORED',
    'The result of the pre-flight could not be kept.',
    'Check that the folder of the rig file can be written; what was found is on the screen.',
  ),
  calibrateCannot: entry(
    'CALIBRATE_CANNOT',
    'This part of the rig cannot be calibrated.',
    'Look at what the rig file says of it: its kind, its `use`, its seam mark.',
  ),
  calibrateNoLine: entry(
    'CALIBRATE_NO_LINE',
    'The weighings make no calibration.',
    'Flush the line until no air comes, use open times that differ more, and weigh again.',
  ),
  calibrateAnswer: entry(
    'CALIBRATE_ANSWER',
    'A guide was given an answer that it cannot use.',
    'Give what was expected; `lapwing calibrate --help` lists the answers that can be given in advance.',
  ),
  calibrateStopped: entry(
    'CALIBRATE_STOPPED',
    'The guide was stopped before its end; nothing was kept.',
    'Outputs are idle. Begin again when the rig is ready.',
  ),
  benchInSession: entry(
    'BENCH_IN_SESSION',
    'Outputs are tried between sessions only.',
    'End the session first; within one, a rule that the operator may ask for drives outputs.',
  ),
  benchBusy: entry(
    'BENCH_BUSY',
    'An output that was tried has not ended yet.',
    'Wait until it is idle; outputs are tried one at a time.',
  ),
  benchWithheld: entry(
    'BENCH_WITHHELD',
    'The output was not tried: the guards or the board said no.',
    "The limit named is the rig file's. Wait, ask for less, or look at the output's settings on the Rig page.",
  ),
  benchLate: entry(
    'BENCH_LATE',
    'The pulse came to the board too late, and was not begun.',
    'Something held this computer up for longer than a tenth of a second. Try again; close other programs if it recurs.',
  ),
  benchStopped: entry(
    'BENCH_STOPPED',
    'What was being tried has been stopped.',
    'Look at the rig, then begin again.',
  ),
  benchOtherRig: entry(
    'BENCH_OTHER_RIG',
    'The rig file now describes another rig, or another way to its board.',
    'End Lapwing and start it again with the new rig file.',
  ),
  webPortBusy: entry(
    'WEB_PORT_BUSY',
    'The address that the page should be served at is in use.',
    'End the program that uses it (another Lapwing?), or choose another with `--port`.',
  ),
  webHostNotLoopback: entry(
    'WEB_HOST_NOT_LOOPBACK',
    'The page would be open to the network, and nobody has to sign in.',
    'Open it with `lapwing serve --listen ADDRESS:PORT`, which makes an operator and a viewer; or stay on 127.0.0.1 and reach it through an SSH tunnel: `ssh -L 8711:127.0.0.1:8711 RIG`.',
  ),
  webListen: entry(
    'WEB_LISTEN',
    'That is no address to serve the page at, or none of a proxy.',
    'Give `--listen` an address and a port, such as `0.0.0.0:8711` or `[::]:8711`, and `--behind-proxy` the address from which the proxy connects.',
  ),
  webTls: entry(
    'WEB_TLS',
    'The certificate or its key cannot be used.',
    'Give `--tls-cert` the certificate with its chain and `--tls-key` its key, both as PEM files that this user may read, the key without a passphrase.',
  ),
  webPerson: entry(
    'WEB_PERSON',
    'There is no such person for this rig, or the name is taken or not allowed.',
    'See who there is with `lapwing people --rig RIG`.',
  ),
  webPeopleFile: entry(
    'WEB_PEOPLE_FILE',
    'The file with the people who may sign in cannot be used.',
    'Let only its owner read it (`chmod 600`). If it is damaged, remove it and add the people again with `lapwing people add`.',
  ),
  webSignInNeeded: entry(
    'WEB_SIGN_IN_NEEDED',
    'Nobody is signed in here, or not any more.',
    'Sign in at /sign-in.html, or from a script with POST /api/sign-in. At the rig, the manual switch and `lapwing quiet` stop everything without it.',
  ),
  webSignInWrong: entry(
    'WEB_SIGN_IN_WRONG',
    'The name or the secret is not right.',
    'Look at what Lapwing printed when the secret was made. A lost one is replaced at the rig: `lapwing people renew NAME --rig RIG`.',
  ),
  webSignInWait: entry(
    'WEB_SIGN_IN_WAIT',
    'Signing in was tried too often in a short time.',
    'Wait as long as it says, then try again.',
  ),
  webRoleRefused: entry(
    'WEB_ROLE_REFUSED',
    'A viewer sees everything and changes nothing.',
    'Ask the operator, or sign in as one.',
  ),
  webControlsElsewhere: entry(
    'WEB_CONTROLS_ELSEWHERE',
    'Another browser holds the controls, or none does, and one operator acts at a time.',
    'Take the controls first. Stopping everything and holding the stimulus work without them.',
  ),
  webControlsChanged: entry(
    'WEB_CONTROLS_CHANGED',
    'The controls are not in the hands that the request names.',
    'Look who holds them now, and take them from there if that is still what you want.',
  ),
  webHostRefused: entry(
    'WEB_HOST_REFUSED',
    'The request names a host that this service is not.',
    'Open the page at the address that Lapwing printed when it started.',
  ),
  webOriginRefused: entry(
    'WEB_ORIGIN_REFUSED',
    'The request comes from another site.',
    'Use the page that Lapwing itself serves; other sites may not steer a rig.',
  ),
  webBodyInvalid: entry(
    'WEB_BODY_INVALID',
    'The request does not have the form that was expected.',
    'Send JSON (`content-type: application/json`) with the fields that the message names.',
  ),
  webBodyTooLarge: entry(
    'WEB_BODY_TOO_LARGE',
    'The request is longer than any that makes sense here.',
    'Send less at once: a note may have 2000 characters.',
  ),
  webTooManyRequests: entry(
    'WEB_TOO_MANY_REQUESTS',
    'Too many requests came from one address in a short time.',
    'Wait a second. Stopping everything is never limited.',
  ),
  webTooManyViewers: entry(
    'WEB_TOO_MANY_VIEWERS',
    'As many pages are watching as the service allows.',
    'Close pages that nobody looks at, then load this one again.',
  ),
  webNotFound: entry(
    'WEB_NOT_FOUND',
    'There is nothing at this address.',
    'Start from the address that Lapwing printed when it started.',
  ),
  webActUnknown: entry(
    'WEB_ACT_UNKNOWN',
    'The running session has no such button, choice, phase or rules file, or the value is out of bounds.',
    'Load the page again: it shows what this session offers and between which bounds.',
  ),
  webRulesPath: entry(
    'WEB_RULES_PATH',
    'This is no rules file that the page may read or write.',
    'Name a .yaml file in the rules folder of the rig file or below it; links and `..` are refused.',
  ),
  webRulesChanged: entry(
    'WEB_RULES_CHANGED',
    'The rules file is not as it was when it was opened, so it was not overwritten.',
    'Open it again to see what is there now, or save under another name.',
  ),
  webRulesUnwritable: entry(
    'WEB_RULES_UNWRITABLE',
    'The rules file could not be read or written.',
    'Check the permissions of the rules folder and the room on the disk.',
  ),
  webNoRig: entry(
    'WEB_NO_RIG',
    'The web process was not told which rig file it serves.',
    'Start Lapwing with `lapwing serve --rig RIG`, or give the web process `--rig-file`.',
  ),
  webRehearsalBusy: entry(
    'WEB_REHEARSAL_BUSY',
    'A rehearsal is running already, and there is one at a time.',
    'Wait for it to end, or cancel it: `DELETE /api/rehearse`.',
  ),
  webSessionUnknown: entry(
    'WEB_SESSION_UNKNOWN',
    'There is no session of that name in the records folder.',
    'Choose one from the list of sessions; its folder may have been moved or renamed.',
  ),
  webNoRecords: entry(
    'WEB_NO_RECORDS',
    'The web process was not told where the records are.',
    'Start Lapwing with `lapwing serve --rig RIG`, or give the web process `--records`.',
  ),
  webNotMade: entry(
    'WEB_NOT_MADE',
    'This was not made from the record yet.',
    'Ask for it first (`POST /api/records/NAME/work`), and fetch it when that job is done.',
  ),
  webOtherSubjects: entry(
    'WEB_OTHER_SUBJECTS',
    'The sessions to compare are not all of one animal, or one of them cannot be compared.',
    'Choose sessions of one animal that have ended; across animals the unit is the animal.',
  ),
  webTooManyJobs: entry(
    'WEB_TOO_MANY_JOBS',
    'So much long work is waiting already that no more is taken.',
    'Wait for some of it to end, or cancel what nobody needs: `GET /api/jobs` lists it.',
  ),
  webJobUnknown: entry(
    'WEB_JOB_UNKNOWN',
    'There is no such job: results are kept for the last few dozen, until the service is started again.',
    'Ask for the work again; what was written stays where it was written.',
  ),
  webJobDied: entry(
    'WEB_JOB_DIED',
    'The process that did this work died or took too long. The record is untouched by it.',
    'Ask again. If it comes back, try the command line, which says more: `lapwing --help`.',
  ),
  webInternal: entry(
    'WEB_INTERNAL',
    'The web process met a fault of its own; the session is not touched by it.',
    'Load the page again. If it comes back, report it with the lines that the service printed.',
  ),
  recordExists: entry(
    'RECORD_EXISTS',
    'The session folder already holds a record, and a record is never overwritten.',
    'Begin a new session; each has a folder of its own.',
  ),
  recordBusy: entry(
    'RECORD_BUSY',
    'The session is being recorded by a running process.',
    'End the session first; while it runs its record can be read but not finished or mended.',
  ),
  recordUnwritable: entry(
    'RECORD_UNWRITABLE',
    'The record could not be begun, so the session was not.',
    'Check that the sessions folder exists, that you may write there (`ls -ld FOLDER`), and that the disk is not full (`df -h FOLDER`).',
  ),
  recordMissing: entry(
    'RECORD_MISSING',
    'There is no record in the folder.',
    'Give the path of a session folder: the one that holds `record.mcap`.',
  ),
  recordTooNew: entry(
    'RECORD_TOO_NEW',
    'The record was written by a later version of Lapwing than this one.',
    'Open it with that version or a later one.',
  ),
  recordUnreadable: entry(
    'RECORD_UNREADABLE',
    'The record could not be read from the disk.',
    'Check the disk and its cable, copy the session folder elsewhere if it can be copied, and try again there.',
  ),
  recordUnfinished: entry(
    'RECORD_UNFINISHED',
    'The finished file did not come out the same as the live record, or could not be written; the live record is untouched.',
    'Check that the disk has room for the record once more (`df -h FOLDER`), then run `lapwing mend SESSION`.',
  ),
  recordFolderRemote: entry(
    'RECORD_FOLDER_REMOTE',
    'The sessions folder is on a network share or is synchronised to another machine; a live recording there can stall or be lost.',
    'Record onto a disk of this computer, and copy the session folder away when it is finished.',
  ),
  recordFolderBad: entry(
    'RECORD_FOLDER_BAD',
    'The session folder could not be made.',
    'Check that the sessions folder exists and that you may write there (`ls -ld FOLDER`).',
  ),
  recordDescriptionBad: entry(
    'RECORD_DESCRIPTION_BAD',
    "The session's description, `session.json`, is missing or not as its schema says.",
    'Compare it with `server/session/session.schema.json`, and mend it by hand; the record does not depend on it.',
  ),
  recordNoSession: entry(
    'RECORD_NO_SESSION',
    'The record holds no beginning of a session.',
    'Its first part is lost or it was never begun: look at what `lapwing mend SESSION` says is missing.',
  ),
  exportFolderBad: entry(
    'EXPORT_FOLDER_BAD',
    'What was to be exported could not be written there.',
    'Choose another place with `--into`, one with room on the disk; nothing half written is left behind.',
  ),
  reportLoopback: entry(
    'REPORT_LOOPBACK',
    'The rig has no such output or input.',
    'Say `--loopback OUTPUT=INPUT` with their names in the rig file of the session.',
  ),
  exportFormatUnknown: entry(
    'EXPORT_FORMAT_UNKNOWN',
    'There is no export of that name.',
    'Say `--to tables` for CSV, `--to parquet` for Parquet, or `--to nwb` for one NWB file.',
  ),
  alignEdgesBad: entry(
    'ALIGN_EDGES_BAD',
    'The file of edge times cannot be read.',
    'Give one time a line, or a CSV with a header and `--column`; seconds, or samples with `--rate`.',
  ),
  alignRefused: entry(
    'ALIGN_REFUSED',
    "The edges could not be matched with the session's own beyond doubt, so nothing was written.",
    'Check that the file is of this session and line (`--line`), that times are in seconds or `--rate` is right, and that both edges were not exported.',
  ),
  animalsNoFolder: entry(
    'ANIMALS_NO_FOLDER',
    'It is not said where the animals are kept.',
    'Give `--animals FOLDER`, or a `--rig` file with a line `animals: FOLDER`, or set LAPWING_ANIMALS.',
  ),
  animalsFolderBad: entry(
    'ANIMALS_FOLDER_BAD',
    'The animals folder cannot be read or written.',
    'Check that the share is connected and that you may write there (`ls -ld FOLDER`); `lapwing animals add` makes a folder that is not there yet.',
  ),
  animalsUnknown: entry(
    'ANIMALS_UNKNOWN',
    'No animal of that name is kept in the animals folder.',
    'Look at `lapwing animals`, or begin to keep it with `lapwing animals add NAME`.',
  ),
  animalsExists: entry(
    'ANIMALS_EXISTS',
    'An animal of that name is kept already.',
    'Change it with `lapwing animals change NAME`, or choose another name.',
  ),
  animalsEntryBad: entry(
    'ANIMALS_ENTRY_BAD',
    'The entry is not one that can be written down.',
    'Correct what is named; amounts have a unit: 23.4 g, 400 uL, 0.4 mL.',
  ),
  animalsUnlikely: entry(
    'ANIMALS_UNLIKELY',
    'The amount looks mistyped, so it was not written down.',
    'Read the balance again. If it is right, say so: `--sure`, or the box on the page. If it is, the animal needs somebody now: tell the veterinarian.',
  ),
  animalsAgainst: entry(
    'ANIMALS_AGAINST',
    'Something speaks against a session with this animal, so none was begun.',
    'Weigh it (`lapwing weigh NAME GRAMS`) or mend what is named. To begin in spite of it, give the reason: `--despite REASON`, or the field on the page; it is kept. The protocol and the veterinarian decide.',
  ),
  blindingNone: entry(
    'BLINDING_NONE',
    'There is no sealed allocation for this.',
    'Make one with `lapwing seal`, and name it and its key in the rig file: `blinding:` with `allocation:` and `key:`.',
  ),
  blindingBad: entry(
    'BLINDING_BAD',
    'The allocation cannot be sealed, read or used.',
    'Correct what is named. An allocation is never edited: seal a new one.',
  ),
  blindingKey: entry(
    'BLINDING_KEY',
    'The key of the allocation is missing, or not the right one.',
    'Ask whoever keeps the key to put it where the rig file says, or give it with `--key FILE`.',
  ),
  blindingNoSlot: entry(
    'BLINDING_NO_SLOT',
    'The allocation has no arm for this session.',
    'Check the name of the animal and `--session-number`; whoever keeps the key seals an allocation that has it.',
  ),
  blindingSealed: entry(
    'BLINDING_SEALED',
    'The arm of this session is sealed.',
    'Ask whoever keeps the key. `lapwing unblind SESSION --reason ...` opens it, and is logged.',
  ),
  rulesInvalid: entry(
    'RULES_INVALID',
    'The rules file has mistakes.',
    'Correct each place named; `lapwing check RULES --rig RIG` shows them again.',
  ),
  rulesOutside: entry(
    'RULES_OUTSIDE',
    'The rules file asked for does not lie in the rules folder.',
    'Choose one of the files listed, or start with another `--rules` folder.',
  ),
  rehearseLatencyBad: entry(
    'REHEARSE_LATENCY_BAD',
    'The file of latencies cannot be read.',
    'Give what `lapwing calibrate latency` kept, or a text file with one number of microseconds on each line.',
  ),
  rehearseAnimalBad: entry(
    'REHEARSE_ANIMAL_BAD',
    'The file that describes the simulated animal is wrong.',
    'Mend the lines that are named. `lapwing animal show` prints a right one with every parameter, its unit and its meaning.',
  ),
  rehearseFailed: entry(
    'REHEARSE_FAILED',
    'A process that rehearsed sessions ended before its work was done.',
    'Try again with fewer `--jobs`; if it goes on, the computer may be short of memory.',
  ),
  planTooFew: entry(
    'PLAN_TOO_FEW',
    'What was given is too little to reckon from.',
    'Give more or longer sessions: complete laps with licks and water are what counts.',
  ),
  loopFailed: entry(
    'LOOP_FAILED',
    'The loop met an error that it does not know.',
    'The outputs are idle and the record is kept. Keep the text above; it is a fault in Lapwing.',
  ),
  loopNoBoard: entry(
    'LOOP_NO_BOARD',
    'No board answers, so no session can begin.',
    'Look at the port and the cable; `lapwing ports` lists what is connected.',
  ),
  loopRigTaken: entry(
    'LOOP_RIG_TAKEN',
    'Another Lapwing runs this rig.',
    'Use its dashboard, or end it first; `lapwing quiet --rig RIG` sets its outputs idle at once.',
  ),
  loopUnfinished: entry(
    'LOOP_UNFINISHED',
    'A session on this rig was left unfinished, by a crash or a power cut.',
    'Go on with it: `lapwing resume --rig RIG`. Or close it first: `lapwing mend SESSION`.',
  ),
  loopKeepsFailing: entry(
    'LOOP_KEEPS_FAILING',
    'The loop process died again and again, and is not started any more.',
    'The outputs are idle and the record is kept. Look at the log above; `lapwing mend SESSION` closes the record.',
  ),
  loopBusy: entry(
    'LOOP_BUSY',
    'A session is running on this rig.',
    'End it before another begins.',
  ),
  loopNoSession: entry('LOOP_NO_SESSION', 'No session is running on this rig.', 'Begin one first.'),
  loopBadAct: entry(
    'LOOP_BAD_ACT',
    'The act is not one that this session allows.',
    'Choose a button, a choice within its bounds, or a phase that the rules file names.',
  ),
  loopAway: entry(
    'LOOP_AWAY',
    'The loop process is not there, so nothing could be sent to the rig.',
    'Nothing is driven while it is away: the board sets its outputs idle 250 ms after it hears nothing. Look at the terminal that runs Lapwing; the launcher starts the loop again by itself.',
  ),
  loopSilent: entry(
    'LOOP_SILENT',
    'The loop process did not answer in time.',
    'Use the manual switch at the rig if an output must go off now; then look at the terminal that runs Lapwing.',
  ),
  loopStale: entry(
    'LOOP_STALE',
    'The loop was held up and read a request too late to act on it.',
    'Ask again. The rig was idle meanwhile: the board sets its outputs idle when the loop is silent.',
  ),
  loopTokenRefused: entry(
    'LOOP_TOKEN_REFUSED',
    'The loop process did not accept the token.',
    'Run this command as the user who started Lapwing, and against the same rig.',
  ),
  loopGarbled: entry(
    'LOOP_GARBLED',
    'What came over the local socket is not what a loop process says.',
    'Check that both ends are of the same Lapwing, and that the socket path is right.',
  ),
} as const satisfies Record<string, ErrorEntry>;

export type ErrorName = keyof typeof ERRORS;

/** An error a user can act on: the entry, and the particulars of this case. */
export class LapwingError extends Error {
  readonly code: string;
  readonly remedy: string;

  constructor(name: ErrorName, particulars: string, options?: ErrorOptions) {
    super(particulars, options);
    this.name = 'LapwingError';
    this.code = ERRORS[name].code;
    this.remedy = ERRORS[name].remedy;
  }
}

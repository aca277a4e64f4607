/** Said wherever a limit of an animal is shown. */
export function Caution() {
  return (
    <p class="caution">
      The approved protocol decides these limits, and the veterinarian when an animal is near one.
      Lapwing only counts.
    </p>
  );
}
